// SPDX-License-Identifier: Apache-2.0
// The same posteriors in SQL with DuckDB, from file to file, on as many threads as asked for.
//
// usage: node peer_duckdb.mjs ROWS.csv TABLES.json PRIORS.json OUT.csv THREADS
// Gate, urgent values, units and faulty rows are not looked at.
import fs from "node:fs";
import { createRequire } from "node:module";
import { pathToFileURL } from "node:url";

const resolve = createRequire(process.cwd() + "/").resolve;
const { DuckDBInstance } = await import(pathToFileURL(resolve("@duckdb/node-api")));
const [rows, tablesFile, priorsFile, out, threads] = process.argv.slice(2);
const tables = JSON.parse(fs.readFileSync(tablesFile)).findings;
const priors = JSON.parse(fs.readFileSync(priorsFile)).causes;

const quantity = {
  serum_potassium: '"serum_potassium [mmol/L]"',
  serum_bicarbonate: '"serum_bicarbonate [mmol/L]"',
  urine_ph: '"urine_ph"',
  urine_anion_gap: '"urine_sodium [mmol/L]" + "urine_potassium [mmol/L]" - "urine_chloride [mmol/L]"',
  gfr: `142 * pow(least("serum_creatinine [umol/L]" * 113.12 / 1e4 / if(sex = 'female', 0.7, 0.9), 1), if(sex = 'female', -0.241, -0.302))
    * pow(greatest("serum_creatinine [umol/L]" * 113.12 / 1e4 / if(sex = 'female', 0.7, 0.9), 1), -1.2) * pow(0.9938, "age [a]") * if(sex = 'female', 1.012, 1.0)`,
};
const band = (table) =>
  `case ${table.edges.map((edge, i) => `when q_${table.finding} < ${edge} then ${i}`).join(" ")} else ${table.edges.length} end`;
const line = (table, cause) =>
  `case b_${table.finding} ${table.rows.find((row) => row.cause === cause).probability.map((p, i) => `when ${i} then ${Math.log(p)}`).join(" ")} end`;

const sql = `copy (
  with q as (select "case", ${tables.map((t) => `${quantity[t.finding]} as q_${t.finding}`).join(", ")} from read_csv('${rows}', header = true)),
  b as (select "case", ${tables.map((t) => `${band(t)} as b_${t.finding}`).join(", ")} from q),
  s as (select "case", ${priors.map((p) => `exp(${Math.log(p.prior)} + ${tables.map((t) => line(t, p.id)).join(" + ")}) as e_${p.id}`).join(", ")} from b),
  n as (select *, ${priors.map((p) => `e_${p.id}`).join(" + ")} as total from s)
  select "case", ${priors.map((p) => `e_${p.id} / total as ${p.id}`).join(", ")},
    case greatest(${priors.map((p) => `e_${p.id}`).join(", ")}) ${priors.map((p) => `when e_${p.id} then '${p.id}'`).join(" ")} end as leader
  from n) to '${out}' (header)`;

const instance = await DuckDBInstance.create(":memory:", { threads });
const connection = await instance.connect();
const start = process.hrtime.bigint();
await connection.run(sql);
console.log((Number(process.hrtime.bigint() - start) / 1e9).toFixed(3));
