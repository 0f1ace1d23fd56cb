// Bundles the script and the style of the page and writes them as one C++ file, with the hashes that the
// Content-Security-Policy of the page names.
//   node build.mjs OUTPUT.cpp
import { createHash } from "node:crypto";
import { writeFileSync } from "node:fs";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";
import { build } from "esbuild";

const here = dirname(fileURLToPath(import.meta.url));
const output = process.argv[2];
if (!output) throw new Error("usage: node build.mjs OUTPUT.cpp");

const bundle = async (entry) => {
  const result = await build({
    entryPoints: [join(here, "src", entry)],
    bundle: true,
    minify: true,
    write: false,
    format: "iife",
    charset: "utf8",
    legalComments: "none",
    // Browsers of 2021 and later.
    target: ["chrome96", "firefox102", "safari15.4"],
  });
  return result.outputFiles[0].text.trimEnd();
};

// Inside <script> and <style> the parser looks for their end tag and for comment openers; the bundle holds none.
const inert = (text, what) => {
  if (/<\/(script|style)|<!--|<script/i.test(text)) throw new Error(`the ${what} would end its own element`);
  return text;
};

// Octets as C++ string literals, short ones: some compilers bound their length.
const literal = (text) => {
  const bytes = Buffer.from(text, "utf8");
  const lines = [];
  for (let start = 0; start < bytes.length; start += 2000) {
    let line = "";
    for (const byte of bytes.subarray(start, start + 2000)) {
      const character = String.fromCharCode(byte);
      if (character === "\\" || character === '"' || character === "?") line += "\\" + character;
      else if (byte >= 32 && byte < 127) line += character;
      else line += "\\" + byte.toString(8).padStart(3, "0");
    }
    lines.push(`    "${line}"`);
  }
  return lines.join("\n");
};

const sha256 = (text) => "sha256-" + createHash("sha256").update(text, "utf8").digest("base64");

const script = inert(await bundle("main.ts"), "script");
const style = inert(await bundle("page.css"), "style");
writeFileSync(
  output,
  `// Written by src/page/build.mjs.
#include "src/output/page_assets.h"

namespace focusfall {

const PageAssets& page_assets() {
  static const PageAssets assets{
    .script =
${literal(script)},
    .style =
${literal(style)},
    .script_hash = "${sha256(script)}",
    .style_hash = "${sha256(style)}",
  };
  return assets;
}

}  // namespace focusfall
`,
);
console.log(`page: script ${script.length} bytes, style ${style.length} bytes`);
