// One Chromium for a run of tests: the Debian package, driven by playwright-core.
import { existsSync, mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { chromium } from "playwright-core";

const candidates = ["/usr/bin/chromium", "/usr/bin/chromium-browser", "/usr/bin/google-chrome"];

// A context with a profile of its own; close() removes it.
export const openBrowser = async (options = {}) => {
  const executablePath = process.env.CHROMIUM ?? candidates.find((path) => existsSync(path));
  if (!executablePath) throw new Error("Chromium is not installed");
  const profile = mkdtempSync(join(tmpdir(), "focusfall-browser-"));
  const context = await chromium.launchPersistentContext(profile, {
    executablePath,
    headless: true,
    viewport: { width: 1280, height: 900 },
    args: ["--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
      "--disable-component-update", "--disable-sync"],
    ...options,
  });
  return {
    context,
    close: async () => {
      await context.close();
      rmSync(profile, { recursive: true, force: true });
    },
  };
};
