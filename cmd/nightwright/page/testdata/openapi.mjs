// Holds an OpenAPI description (stdin) against the standard's own schema, and
// prints what is wrong, or "valid VERSION".
// Usage: node openapi.mjs FOLDER-WITH-node_modules < openapi.json
import path from "node:path";
import { pathToFileURL } from "node:url";
import { text } from "node:stream/consumers";

const folder = path.resolve(process.argv[2], "node_modules", "@seriousme", "openapi-schema-validator", "index.js");
const { Validator } = await import(pathToFileURL(folder));
const validator = new Validator();
const result = await validator.validate(JSON.parse(await text(process.stdin)));
console.log(result.valid ? `valid ${validator.version}` : JSON.stringify(result.errors, null, 1));
