// npm ci && npm run build: bundles src/ and three.js into view.js, headed by a digest of its sources.
import { createHash } from "node:crypto";
import { readdirSync, readFileSync } from "node:fs";
import { build } from "esbuild";

const sources = [...readdirSync("src").sort().map((name) => `src/${name}`), "package-lock.json"];
const digest = createHash("sha256");
for (const name of sources) digest.update(readFileSync(name));

await build({
  entryPoints: ["src/main.js"],
  outfile: "view.js",
  bundle: true,
  minify: true,
  format: "iife",
  target: "es2022",
  legalComments: "inline",
  banner: { js: `// sources ${digest.digest("hex")}` },
});
