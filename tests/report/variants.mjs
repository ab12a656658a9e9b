// Opens a page about variants in headless Chromium and prints as JSON what happened.
//
//   node variants.mjs BROWSER PAGE FOLDER
//
// BROWSER is the program, PAGE a file, FOLDER where playwright-core and axe-core are installed.
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
const out = { requests: [], console: [], faults: {}, overflow: {}, outside: {} };

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

const wide = { width: 1280, height: 900 };
const phone = { width: 360, height: 740 };
for (const [name, viewport, colorScheme] of [
  ["light", wide, "light"], ["dark", wide, "dark"], ["phone", phone, "light"],
]) {
  // Without the page's own policy a request would not only be tried, it would be made.
  const tab = await open({ viewport, colorScheme, bypassCSP: true });
  await tab.evaluate(() => document.querySelectorAll("details").forEach((d) => { d.open = true; }));
  out.overflow[name] = await tab.evaluate(
    () => document.documentElement.scrollWidth - window.innerWidth);
  // Every mark of a curve must lie within the window: what is cut off nobody scrolls to.
  out.outside[name] = await tab.evaluate(() => [...document.querySelectorAll(".curve circle")]
    .map((mark) => mark.getBoundingClientRect())
    .filter((box) => box.left < 0 || box.right > window.innerWidth || !box.width).length);
  await tab.evaluate(axe);
  const found = await tab.evaluate(() => globalThis.axe.run(document));
  out.faults[name] = found.violations.map(
    (v) => [v.impact, v.id, v.nodes.slice(0, 3).map((n) => n.html)]);
}

const tab = await open({ viewport: wide });
const losses = (column) => tab.evaluate((at) => [
  ...document.querySelectorAll(".variant-losses tbody tr"),
].map((row) => Number(row.cells[at].dataset.value)), column);
out.asWritten = await losses(0);
const heads = tab.locator(".variant-losses thead th");
const column = await tab.evaluate(() => [
  ...document.querySelectorAll(".variant-losses thead th"),
].findIndex((head) => head.textContent.startsWith("Trials kept")));
await heads.nth(column).locator("button").focus();
await tab.keyboard.press("Enter");
out.ascending = await losses(column);
await tab.keyboard.press("Enter");
out.descending = await losses(column);
out.sorted = await heads.nth(column).getAttribute("aria-sort");
out.selected = await tab.evaluate(() => {
  const passage = document.querySelector(".passage");
  return getComputedStyle(passage).userSelect;
});

const still = await open({ viewport: wide, javaScriptEnabled: false });
out.withoutScripts = {
  rows: await still.locator(".variant-losses tbody tr").count(),
  curves: await still.locator(".curve-plot").count(),
  buttons: await still.locator("button").count(),
};
const printed = await open({ viewport: wide });
await printed.emulateMedia({ media: "print", colorScheme: "dark" });
out.print = {
  paper: await printed.evaluate(() => getComputedStyle(document.body).backgroundColor),
  nav: await printed.locator("nav").isVisible(),
  bytes: (await printed.pdf({ format: "A4" })).length,
};
await browser.close();
console.log(JSON.stringify(out));
