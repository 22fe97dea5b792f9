// Opens pages in a headless browser and says, as JSON, what happened: console, requests, rules of accessibility broken.
//
//   node look.mjs BROWSER PAGE.html [PAGE.pdf]

import { createRequire } from "node:module";
import { readFileSync } from "node:fs";
import { pathToFileURL } from "node:url";
import process from "node:process";

const require = createRequire(`${process.cwd()}/package.json`);
const puppeteer = require("puppeteer-core");
const axe = readFileSync(require.resolve("axe-core/axe.min.js"), "utf8");
const [browserPath, page, pdf] = process.argv.slice(2);

const browser = await puppeteer.launch({
  executablePath: browserPath,
  pipe: true,
  args: [
    "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
    "--disable-component-update", "--disable-sync",
  ],
});
const found = { console: [], requests: [], dialogs: [], violations: {}, incomplete: {} };
try {
  for (const [name, width] of [["wide", 1280], ["narrow", 360]]) {
    const tab = await browser.newPage();
    await tab.setViewport({ width, height: 900 });
    tab.on("console", (said) => found.console.push(said.text()));
    tab.on("pageerror", (error) => found.console.push(String(error)));
    tab.on("dialog", (dialog) => { found.dialogs.push(dialog.message()); dialog.dismiss(); });
    tab.on("request", (request) => found.requests.push(request.url().slice(0, 40)));
    await tab.goto(pathToFileURL(page).href, { waitUntil: "load" });
    await new Promise((done) => setTimeout(done, 300));
    found.title = await tab.title();
    found.scripts = await tab.evaluate(() => document.querySelectorAll("script, iframe, object, embed, link").length);
    found.broken = await tab.evaluate(() => [...document.images].filter((i) => !i.naturalWidth).map((i) => i.alt));
    found[`${name}_overflow`] = await tab.evaluate(
      () => document.documentElement.scrollWidth - document.documentElement.clientWidth,
    );
    found.maths = await tab.evaluate(
      () => [...document.querySelectorAll("math")].filter((m) => m.getBoundingClientRect().height < 8).length,
    );
    await tab.evaluate(axe);
    const result = await tab.evaluate(() => globalThis.axe.run(document, { resultTypes: ["violations", "incomplete"] }));
    for (const kind of ["violations", "incomplete"]) {
      found[kind][name] = result[kind].map((rule) => ({
        rule: rule.id, help: rule.help, count: rule.nodes.length, nodes: rule.nodes.slice(0, 3).map((node) => node.html.slice(0, 200)),
      }));
    }
    if (pdf && name === "wide") await tab.pdf({ path: pdf, preferCSSPageSize: true });
    await tab.close();
  }
} finally {
  await browser.close();
}
process.stdout.write(JSON.stringify(found));
