// Reads Parquet tables with DuckDB and prints what it sees as JSON: for each
// file its metadata's schema_version, its columns with their types, and all
// rows, instants as microseconds.
// Usage: node duckdb.mjs FOLDER-WITH-node_modules FILE...
import { createRequire } from "node:module";
import path from "node:path";

const [, , modules, ...files] = process.argv;
const require = createRequire(path.join(path.resolve(modules), "package.json"));
const { DuckDBInstance } = require("@duckdb/node-api");

const instance = await DuckDBInstance.create(":memory:");
const db = await instance.connect();
await db.run("SET TimeZone = 'UTC'");
const rows = async (sql) => (await db.runAndReadAll(sql)).getRowObjectsJson();

const out = [];
for (const file of files) {
  const from = `read_parquet('${file.replaceAll("'", "''")}')`;
  const columns = (await rows(`DESCRIBE SELECT * FROM ${from}`)).map((c) => [c.column_name, c.column_type, c.null]);
  const cells = columns.map(([name, type]) => (type.startsWith("TIMESTAMP") ? `epoch_us("${name}") AS "${name}"` : `"${name}"`));
  const kept = await rows(`SELECT decode(key) AS key, decode(value) AS value FROM parquet_kv_metadata('${file.replaceAll("'", "''")}')`);
  const codecs = await rows(`SELECT DISTINCT compression FROM parquet_metadata('${file.replaceAll("'", "''")}')`);
  const table = await rows(`SELECT ${cells.join(", ")} FROM ${from}`);
  out.push({
    columns,
    metadata: kept.map((m) => [m.key, m.value]),
    codecs: codecs.map((c) => c.compression),
    rows: table.map((r) => columns.map(([name]) => (r[name] === null ? "" : String(r[name])))),
  });
}
console.log(JSON.stringify(out));
