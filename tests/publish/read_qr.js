// The QR codes of a page, as a camera would read them from the screen: node read_qr.js CHROMIUM PAGE-FILE
const { chromium } = require("playwright-core");
const fs = require("fs");
const [executablePath, file] = process.argv.slice(2);
const jsqr = fs.readFileSync(require.resolve("jsqr"), "utf8");

(async () => {
  const browser = await chromium.launch({ executablePath, args: ["--no-sandbox"] });
  const page = await browser.newPage({ viewport: { width: 1000, height: 1200 }, colorScheme: "dark", bypassCSP: true });
  await page.goto("file://" + file);
  await page.addScriptTag({ content: jsqr });
  const read = [];
  for (const code of await page.locator("svg.qr").all()) {
    const png = (await code.screenshot()).toString("base64");
    read.push(await page.evaluate(async (png) => {
      const image = new Image();
      image.src = "data:image/png;base64," + png;
      await image.decode();
      const canvas = Object.assign(document.createElement("canvas"), { width: image.width * 2, height: image.height * 2 });
      const context = canvas.getContext("2d");
      context.imageSmoothingEnabled = false;
      context.drawImage(image, 0, 0, canvas.width, canvas.height);
      const pixels = context.getImageData(0, 0, canvas.width, canvas.height);
      const found = jsQR(pixels.data, pixels.width, pixels.height);
      return found && found.data;
    }, png));
  }
  await browser.close();
  console.log(JSON.stringify(read));
})();
