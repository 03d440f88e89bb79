// Runs the Khronos glTF validator on a written file and compares it with the file it was made from.
//
//   node tests/outside/validate.mjs SOURCE RESULT
//   node tests/outside/validate.mjs RESULT               a file without a source
//   node tests/outside/validate.mjs --list PAIRS.tsv     lines of SOURCE<tab>RESULT
//
// Exits with 1 when a result has an error or warning that its source has not (or any, without a source), and with 2
// when nothing was checked. The package `gltf-validator` is looked for under target/outside, then where the command is
// run, then in NODE_PATH.

import { createRequire } from "node:module";
import { readFileSync } from "node:fs";
import { dirname, join, resolve } from "node:path";

const installed = createRequire(join(process.cwd(), "target/outside/package.json"));
const here = createRequire(join(process.cwd(), "package.json"));
let validator;
try {
  validator = installed("gltf-validator");
} catch {
  validator = here("gltf-validator");
}

async function report(file) {
  const bytes = new Uint8Array(readFileSync(file));
  return validator.validateBytes(bytes, {
    uri: file,
    maxIssues: 0,
    externalResourceFunction: async (uri) =>
      new Uint8Array(readFileSync(resolve(dirname(file), decodeURIComponent(uri)))),
  });
}

// Issues of the two severities that count, by code: { "ACCESSOR_MIN_MISMATCH": 2, … }.
function counts(issues) {
  const found = new Map();
  for (const message of issues.messages) {
    if (message.severity <= 1) {
      found.set(message.code, (found.get(message.code) ?? 0) + 1);
    }
  }
  return found;
}

function pairsOf(args) {
  if (args[0] === "--list") {
    const lines = readFileSync(args[1], "utf8").split("\n").filter((line) => line !== "");
    return lines.map((line) => line.split("\t"));
  }
  if (args.length === 2) return [args];
  return args.map((result) => [null, result]);
}

let worse = 0;
const pairs = pairsOf(process.argv.slice(2));
for (const [source, result] of pairs) {
  const after = (await report(result)).issues;
  const before = source === null ? null : (await report(source)).issues;
  const allowed = before === null ? new Map() : counts(before);
  const fresh = [...counts(after)].filter(([code, n]) => n > (allowed.get(code) ?? 0));
  const numbers = (issues) => `${issues.numErrors}/${issues.numWarnings}`;
  const was = before === null ? "" : ` (source ${numbers(before)})`;
  console.log(`${fresh.length === 0 ? "ok " : "BAD"} ${result}: ${numbers(after)} errors/warnings${was}`);
  for (const [code, n] of fresh) {
    worse += 1;
    const example = after.messages.find((message) => message.code === code);
    console.log(`    ${code} × ${n}: ${example.pointer ?? ""} ${example.message}`);
  }
}
if (pairs.length === 0) {
  console.log("nothing to check");
  process.exit(2);
}
console.log(`${pairs.length} files, ${worse} new kinds of error or warning`);
process.exit(worse === 0 ? 0 : 1);
