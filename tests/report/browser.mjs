// Opens a page in headless Chromium and prints as JSON what happened.
//
//   node browser.mjs BROWSER PAGE FOLDER
//
// BROWSER is the program, PAGE a file, FOLDER where playwright-core and axe-core are installed.
// The page is opened light and dark, wide and on a phone, for print, and without scripts; every
// request and every message of the console is noted; axe-core looks for faults of accessibility.
import { createRequire } from "node:module";
import { readFileSync } from "node:fs";
import { pathToFileURL } from "node:url";

const [, , program, page, folder] = process.argv;
const require = createRequire(pathToFileURL(folder + "/"));
const { chromium } = require("playwright-core");
const axe = readFileSync(require.resolve("axe-core/axe.min.js"), "utf-8");
const address = pathToFileURL(page).href;

const quiet = ["no-sandbox", "disable-gpu", "disable-quic", "no-first-run", "disable-sync",
  "disable-background-networking", "disable-component-update"].map((name) => "--" + name);
const browser = await chromium.launch({ executablePath: program, args: quiet });
const out = { requests: [], console: [], faults: {}, overflow: {} };

async function open(options) {
  const context = await browser.newContext(options);
  const tab = await context.newPage();
  tab.on("request", (request) => {
    if (request.url() !== address && request.url() !== "data:,") out.requests.push(request.url());
  });
  tab.on("console", (message) => out.console.push(message.type() + ": " + message.text()));
  tab.on("pageerror", (error) => out.console.push("error: " + error.message));
  await tab.goto(address);
  return tab;
}

async function faults(tab) {
  await tab.evaluate(() => document.querySelectorAll("details").forEach((d) => { d.open = true; }));
  await tab.evaluate(axe);
  const found = await tab.evaluate(() => globalThis.axe.run(document));
  return found.violations.map((v) => [v.impact, v.id, v.nodes.slice(0, 3).map((n) => n.html)]);
}

const wide = { width: 1280, height: 900 };
const phone = { width: 360, height: 740 };
for (const [name, viewport, colorScheme] of [
  ["light", wide, "light"], ["dark", wide, "dark"], ["phone", phone, "light"],
]) {
  // Without the page's own policy a request would not only be tried, it would be made.
  const tab = await open({ viewport, colorScheme, bypassCSP: true });
  out.overflow[name] = await tab.evaluate(
    () => document.documentElement.scrollWidth - window.innerWidth);
  out[name + "Paper"] = await tab.evaluate(() => getComputedStyle(document.body).backgroundColor);
  out.faults[name] = await faults(tab);
}

const tab = await open({ viewport: wide });
const names = () => tab.evaluate(() => [...document.querySelectorAll("#reader-table tbody tr")]
  .filter((row) => !row.hidden).map((row) => row.dataset.reader));
out.asWritten = await names();
const button = tab.locator("#reader-table th[data-measure=duration] button");
await button.focus();
await tab.keyboard.press("Enter");
out.ascending = await names();
out.sorted = await tab.locator("#reader-table th[data-measure=duration]").getAttribute("aria-sort");
await tab.keyboard.press("Enter");
out.descending = await names();
await tab.locator("#find").fill("p1");
out.found = await names();
await tab.locator("#find").fill("");
await tab.locator("#choose").selectOption("out");
out.standingOut = await names();
out.status = await tab.locator("#shown").textContent();
await tab.locator("#choose").selectOption("all");

// Links to fold-outs unfold them: from the overview, and once more after one was folded by hand.
const open_ones = () => tab.evaluate(() => [...document.querySelectorAll(".ready-one[open]")]
  .map((one) => one.id));
const tile = tab.locator(".tiles a");
out.unfolded = [];
if (await tile.count()) {
  await tile.first().focus();
  await tab.keyboard.press("Enter");
  out.unfolded.push(await open_ones());
  await tab.locator(".ready-one[open] > summary").click();
  out.unfolded.push(await open_ones());
  await tile.first().focus();
  await tab.keyboard.press("Enter");
  out.unfolded.push(await open_ones());
  out.unfoldedAddress = await tab.evaluate(() => location.hash);
}

await tab.evaluate(() => document.activeElement.blur());
await tab.evaluate(() => window.scrollTo(0, 0));
await tab.goto(address);
await tab.keyboard.press("Tab");
out.firstStop = await tab.evaluate(() => document.activeElement.textContent);
const stops = new Set();
for (let press = 0; press < 400; press += 1) {
  const stop = await tab.evaluate(() => {
    const own = document.activeElement;
    return own === document.body ? "" : own.outerHTML.slice(0, 160);
  });
  if (stop === "" || stops.has(stop + press)) break;
  stops.add(stop);
  await tab.keyboard.press("Tab");
}
out.stops = [...stops];

const still = await open({ viewport: wide, javaScriptEnabled: false });
out.withoutScripts = {
  rows: await still.locator("#reader-table tbody tr").count(),
  drawings: await still.locator("svg").count(),
  controls: await still.locator(".controls").isVisible(),
  buttons: await still.locator("button").count(),
};

const printed = await open({ viewport: wide });
await printed.emulateMedia({ media: "print", colorScheme: "dark" });
await printed.evaluate(() => document.querySelectorAll(".ready-one").forEach((one, place) => {
  one.open = place === 0;
}));
await printed.evaluate(() => window.dispatchEvent(new Event("beforeprint")));
out.print = {
  paper: await printed.evaluate(() => getComputedStyle(document.body).backgroundColor),
  nav: await printed.locator("nav").isVisible(),
  unfolded: await printed.locator(".ready-one[open]").count(),
  bytes: (await printed.pdf({ format: "A4" })).length,
};
await browser.close();
console.log(JSON.stringify(out));
