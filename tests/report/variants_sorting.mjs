// Sorts the numbers of a curve on a page about variants in headless Chromium and prints as JSON
// what stands where then.
//
//   node variants_sorting.mjs BROWSER PAGE FOLDER
//
// BROWSER is the program, PAGE a file, FOLDER where playwright-core is installed.
import { createRequire } from "node:module";
import { pathToFileURL } from "node:url";

const [, , program, page, folder] = process.argv;
const require = createRequire(pathToFileURL(folder + "/"));
const { chromium } = require("playwright-core");
const quiet = ["no-sandbox", "disable-gpu", "disable-quic", "no-first-run", "disable-sync",
  "disable-background-networking", "disable-component-update"].map((name) => "--" + name);
const browser = await chromium.launch({ executablePath: program, args: quiet });
const tab = await browser.newPage();
const out = { errors: [] };
tab.on("pageerror", (error) => out.errors.push(error.message));
await tab.goto(pathToFileURL(page).href);
await tab.evaluate(() => document.querySelectorAll("details").forEach((d) => { d.open = true; }));

const rows = () => tab.evaluate(() => [
  ...document.querySelector(".numbers").tBodies[0].rows,
].map((row) => [row.hasAttribute("data-gap"), row.cells[0].dataset.value, row.cells[2]?.textContent]));
const heads = tab.locator(".numbers").first().locator("thead th button");
out.asWritten = await rows();
await heads.nth(2).click();
out.byDecision = await rows();
await heads.nth(0).click();
out.byPlace = await rows();
await browser.close();
console.log(JSON.stringify(out));
