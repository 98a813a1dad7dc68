// Prints the one line that closes the gate: how many tests passed, failed and were skipped. In the gate
// nothing may be skipped, and a report without tests is a failure of its own.
import { readFileSync } from 'node:fs';

const report = JSON.parse(readFileSync(process.argv[2], 'utf8'));
const skipped = report.numPendingTests + report.numTodoTests;
const brokenFiles = report.testResults.filter(
  (file) => file.status === 'failed' && file.assertionResults.length === 0,
).length;
const failed = report.numFailedTests + brokenFiles;
if (report.numPassedTests === 0 || skipped > 0 || failed > 0) process.exitCode = 1;
console.log(`tests: ${report.numPassedTests} passed, ${failed} failed, ${skipped} skipped`);
