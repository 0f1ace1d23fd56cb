// Pictures of a page for whoever works on it:
//   node screenshots.mjs PAGE FOLDER [address ...]
import { join, resolve } from "node:path";
import { openBrowser } from "./browser.mjs";

const [page, folder, ...addresses] = process.argv.slice(2);
const sizes = [[390, 844], [1280, 900], [2560, 1440]];
for (const colorScheme of ["light", "dark"]) {
  const { context, close } = await openBrowser({ colorScheme });
  const tab = await context.newPage();
  tab.on("console", (message) => console.log(`${message.type()}: ${message.text()}`));
  tab.on("pageerror", (error) => console.log(`error: ${error.message}`));
  const url = /^http/.test(page) ? page : `file://${resolve(page)}`;
  for (const [width, height] of sizes) {
    for (const [number, address] of (addresses.length ? addresses : [""]).entries()) {
      await tab.setViewportSize({ width, height });
      await tab.goto("about:blank");
      await tab.goto(url + (address ? "#" + address : ""));
      await tab.waitForSelector("html[data-ready]");
      await tab.screenshot({ path: join(folder, `${colorScheme}-${width}-${number}.png`), fullPage: number === 0 });
    }
  }
  await close();
}
