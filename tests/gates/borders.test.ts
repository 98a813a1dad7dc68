// The import borders hold, and the tool that checks them really looked: under some compilers it sees
// nothing and reports success.
import { execFile } from 'node:child_process';
import { readdirSync } from 'node:fs';
import { promisify } from 'node:util';
import { expect, it } from 'vitest';

const execute = promisify(execFile);
const folders = ['daemon', 'drivers', 'mocks', 'dashboard'];
const cruiser = 'node_modules/dependency-cruiser/bin/dependency-cruise.mjs';

interface CruiseReport {
  summary: { totalCruised: number; totalDependenciesCruised: number; error: number };
  modules: { source: string; dependencies: { resolved: string; dependencyTypes: string[] }[] }[];
}

function sourceFiles(folder: string): string[] {
  return readdirSync(folder, { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith('.ts'))
    .map((name) => `${folder}/${name}`);
}

async function cruise(...paths: string[]): Promise<CruiseReport> {
  const { stdout } = await execute(
    process.execPath,
    [cruiser, '--config', '.dependency-cruiser.cjs', '--output-type', 'json', ...paths],
    { maxBuffer: 64e6 },
  ).catch((failure: { stdout: string }) => failure);
  return JSON.parse(stdout);
}

it('sees every source file and finds no forbidden import', async () => {
  const report = await cruise(...folders);
  const seen = new Set(report.modules.map((module) => module.source));
  const missed = folders.flatMap(sourceFiles).filter((file) => !seen.has(file));
  expect(missed).toEqual([]);
  expect(report.summary.totalDependenciesCruised).toBeGreaterThan(seen.size);
  expect(report.summary.error).toBe(0);
});
