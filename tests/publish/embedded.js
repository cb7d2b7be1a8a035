// The list of dates on a page of another origin: node embedded.js CHROMIUM SITE-FOLDER
// Serves the site and a host page from two origins, without any permission for other origins, and prints what shows.
const fs = require("fs"), http = require("http"), path = require("path");
const { chromium } = require("playwright-core");
const axe = fs.readFileSync(require.resolve("axe-core/axe.min.js"), "utf8");
const [executablePath, folder] = process.argv.slice(2);
const TYPES = { ".js": "text/javascript", ".html": "text/html", ".css": "text/css" };

const serve = (answer) => new Promise((done) => {
  const server = http.createServer(answer).listen(0, "127.0.0.1", () => done([server, `http://127.0.0.1:${server.address().port}`]));
});
const host = (site, body, policy = "") => `<!doctype html><html lang="en"><head><meta charset="utf-8">${policy}<title>Host</title>
<style>body{font-family:monospace;color:rgb(10,60,10);background:#fff}a{color:rgb(10,60,10)}</style></head><body><main><h1>Host</h1>${body}</main></body></html>`;

(async () => {
  const [site, siteAt] = await serve((request, response) => {
    const file = path.join(folder, decodeURIComponent(request.url.replace(/\/$/, "/index.html")));
    if (!fs.existsSync(file)) return response.writeHead(404).end();
    response.writeHead(200, { "content-type": TYPES[path.extname(file)] || "text/plain" });
    response.end(fs.readFileSync(file));
  });
  const pages = {};
  const [partner, partnerAt] = await serve((request, response) => {
    response.writeHead(200, { "content-type": "text/html; charset=utf-8" }).end(pages[request.url]);
  });
  const list = (language, rest = "") =>
    `<script async src="${siteAt}/embed/${language}.js"></script>
     <moonwrit-dates count="3" today="2026-12-01" ${rest}><a href="${siteAt}/">Fallback</a></moonwrit-dates>`;
  pages["/en"] = host(siteAt, list("en"));
  pages["/ar"] = host(siteAt, list("ar"));
  pages["/late"] = host(siteAt, list("en").replace("2026-12-01", "2099-01-01"));
  pages["/strict"] = host(siteAt, list("en"), `<meta http-equiv="Content-Security-Policy" content="default-src 'none'; script-src ${siteAt}; style-src 'unsafe-inline'">`);
  pages["/blocked"] = host(siteAt, list("en"), `<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'">`);
  pages["/frame"] = host(siteAt, `<iframe title="Dates" src="${siteAt}/embed/ar.html" width="300" height="300"></iframe>`);

  const browser = await chromium.launch({ executablePath, args: ["--no-sandbox"] });
  const found = {};
  for (const name of Object.keys(pages)) {
    const page = await browser.newPage();
    const faults = [], asked = [];
    page.on("pageerror", (error) => faults.push(String(error)));
    page.on("request", (request) => asked.push(new URL(request.url()).origin));
    await page.goto(partnerAt + name, { waitUntil: "networkidle" });
    const frame = name === "/frame" ? page.frames()[1] : page;
    const seen = await frame.evaluate(() => {
      const element = document.querySelector("moonwrit-dates"), root = element.shadowRoot;
      if (!root) return { fallback: element.textContent.trim() };
      const all = root.querySelector("section"), link = root.querySelector("li a");
      return {
        direction: getComputedStyle(all).direction, language: all.lang, label: all.getAttribute("aria-label"),
        today: root.querySelector("[part=today]").textContent,
        titles: [...root.querySelectorAll("li a")].map((a) => a.textContent),
        when: [...root.querySelectorAll("li span")].map((span) => span.textContent),
        font: getComputedStyle(link).fontFamily, colour: getComputedStyle(link).color,
        links: [...root.querySelectorAll("a")].map((a) => a.href),
      };
    });
    await page.keyboard.press("Tab");
    seen.focus = await page.evaluate(() => {
      const active = document.activeElement;
      return ((active.shadowRoot && active.shadowRoot.activeElement) || active).textContent;
    });
    if (name !== "/strict" && name !== "/blocked") {
      await page.evaluate(axe);
      const result = await page.evaluate("axe.run({ iframes: true })");
      seen.violations = result.violations.map((one) => one.id);
    }
    found[name] = { ...seen, faults, strangers: asked.filter((origin) => ![siteAt, partnerAt].includes(origin)) };
    await page.close();
  }
  await browser.close();
  site.close();
  partner.close();
  console.log(JSON.stringify(found));
})();
