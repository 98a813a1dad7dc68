// The process that durability.test.ts kills: adds samples for as long as it lives, and announces each on
// stdout once its promise has resolved. Arguments: path of the archive, run (0 for a new one), first sequence.
import { writeSync } from 'node:fs';
import { openArchive } from '../../../../daemon/archive/open-archive.ts';
import { durableSample, durableSetup } from './durable-samples.ts';
import { newRun, segment } from './records.ts';

const [path = '', runText = '0', firstText = '1'] = process.argv.slice(2);
const archive = await openArchive(path);
let run = Number(runText);
if (run === 0) {
  run = (await archive.createRun(newRun)).number;
  await archive.addSegment(run, segment);
  await archive.addSetup(run, durableSetup);
}
for (let sequence = Number(firstText); ; sequence += 1) {
  await archive.addSample(run, durableSample(sequence));
  writeSync(1, `${sequence}\n`);
}
