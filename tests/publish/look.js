// Look at pages of a built site as a browser does: node look.js CHROMIUM FOLDER PAGE...
// Prints, for each page, colour scheme and width: the axe-core violations, what the browser complains of, requests
// to other hosts, and by how many pixels the page is wider than the window.
const fs = require("fs"), path = require("path");
const { chromium } = require("playwright-core");
const axe = fs.readFileSync(require.resolve("axe-core/axe.min.js"), "utf8");
const [executablePath, folder, ...pages] = process.argv.slice(2);
const HERE = "http://site.example/";

async function look(browser, colorScheme, width) {
  const context = await browser.newContext({ colorScheme, viewport: { width, height: 800 } });
  const found = [];
  let faults = [];
  await context.route("**", (route) => {
    const url = new URL(route.request().url());
    if (!url.href.startsWith(HERE)) {
      faults.push(`asks ${url.href}`);
      return route.abort();
    }
    const file = path.join(folder, decodeURIComponent(url.pathname), url.pathname.endsWith("/") ? "index.html" : "");
    return fs.existsSync(file) ? route.fulfill({ path: file }) : route.fulfill({ status: 404, body: "" });
  });
  const page = await context.newPage();
  page.on("console", (message) => faults.push(message.text()));
  page.on("pageerror", (error) => faults.push(String(error)));
  for (const name of pages) {
    faults = [];
    await page.goto(HERE + name);
    await page.evaluate("for (const more of document.querySelectorAll('details')) more.open = true");
    await page.evaluate(axe);
    const { violations, passes } = await page.evaluate("axe.run()");
    found.push({
      page: name, colorScheme, width, faults, passes: passes.length,
      wider: await page.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth"),
      violations: violations.map((v) => `${v.id}: ${v.help}: ${v.nodes.map((n) => n.target + " " + n.html).join("; ")}`),
    });
  }
  await context.close();
  return found;
}

(async () => {
  const browser = await chromium.launch({ executablePath, args: ["--no-sandbox"] });
  const all = ["light", "dark"].flatMap((scheme) => [1280, 320].map((width) => [scheme, width]));
  // LOOKS=crossed: light and wide, dark and narrow.
  const chosen = process.env.LOOKS === "crossed" ? [all[0], all[3]] : all;
  const looks = chosen.map(([scheme, width]) => look(browser, scheme, width));
  console.log(JSON.stringify((await Promise.all(looks)).flat()));
  await browser.close();
})();
