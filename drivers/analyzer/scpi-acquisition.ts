// One acquisition: averaging cleared, as many sweeps started as an average needs, their end awaited by
// polling, the traces read, and the grid looked at once more, for the front panel may change anything.
//
//   ESR read (stale bits, until bit 0 is clear) ─► averaging cleared ─► [ INIT, *OPC, poll ESR until bit 0 ] × starts
//   ─► for each parameter: select, read ─► ESR (a refused select?) ─► axis, or start, stop, points
//
// `*OPC?` is never asked: it makes the instrument deaf, and a late "1" would shift all later answers.
import { DriverError, isDriverError } from '../errors.ts';
import type { Acquisition, SParameter, SweepSetup, TimeLaw } from './analyzer.ts';
import type { ScpiConversation } from './scpi-conversation.ts';
import { confirmAxis, confirmGrid, type InstrumentSweep, requireAxis } from './scpi-setup.ts';
import { anyErrorBits, eventBits } from './scpi-status.ts';
import type { Completion, Substitutions, TraceColumn } from './scpi-templates.ts';
import { decodeWord } from './scpi-values.ts';

/** One is enough for a register that works, two where an end of before stood in it. */
const clearingReads = 3;
const firstPollMs = 2;
const pollGrowth = 1.5;
/** Between two polls at most: this, or in a long sweep a twentieth of it, which is what an early end costs. */
const longestPollMs = 100;
const longestPollShare = 1 / 20;
const deadlineFactor = 1.5;
/** Retrace, band switching and settling are often left out of the stated sweep time. */
const statedSlackMs = 500;
/** An estimate knows nothing of how the instrument sweeps. */
const estimatedSlackMs = 15_000;
/** An end before this share of the stated time is doubted. */
const earlyShare = 0.5;

export interface SweepRun {
  startMonotonicMs: number;
  stopMonotonicMs: number;
  timeLaw: TimeLaw;
  /** When the time of the last start should have been over, where its end came doubtfully early. */
  statedEndMs: number | undefined;
}

function slackMsOf(sweep: InstrumentSweep): number {
  return sweep.isStated ? statedSlackMs : estimatedSlackMs;
}

/** Sweeps, and returns when. Throws ANALYZER_SWEEP_TIMEOUT, ANALYZER_DEVICE_ERROR, ANALYZER_POWER_CYCLED … */
export async function runSweeps(
  talk: ScpiConversation,
  sweep: InstrumentSweep,
  answerTimeoutMs: number,
): Promise<SweepRun> {
  await clearEvents(talk);
  if (sweep.averages > 1) await talk.tell('averagingClear');
  const startedMs: number[] = [];
  for (let start = 0; start < sweep.starts; start += 1) {
    startedMs.push(talk.clock.monotonicMs());
    await talk.tell('startSweep');
    if (talk.dialect.completion.by === 'operation-complete-bit') await talk.tellPlain('*OPC');
    await awaitEnd(talk, sweep, startedMs, answerTimeoutMs);
  }
  const stopMonotonicMs = talk.clock.monotonicMs();
  const startMonotonicMs = startedMs[0] ?? stopMonotonicMs;
  const timeLaw = timeLawOf(sweep, startedMs, stopMonotonicMs);
  return {
    startMonotonicMs,
    stopMonotonicMs,
    timeLaw,
    // Nobody has said that a sweep has ended whose time was merely waited out.
    statedEndMs:
      talk.dialect.completion.by === 'wait'
        ? stopMonotonicMs
        : doubtfulEnd(sweep, startedMs, stopMonotonicMs),
  };
}

function doubtfulEnd(
  sweep: InstrumentSweep,
  startedMs: readonly number[],
  stopMs: number,
): number | undefined {
  const lastStartMs = startedMs.at(-1) ?? stopMs;
  const statedMs = sweep.passMs * sweep.passesPerStart;
  return stopMs - lastStartMs < statedMs * earlyShare ? lastStartMs + statedMs : undefined;
}

/**
 * Some instruments call an operation complete that has only begun, and what is read then is the sweep before.
 * Once the stated time is over the trace must still be the same. Throws ANALYZER_DEVICE_ERROR.
 */
export async function confirmEnd(
  talk: ScpiConversation,
  sweep: InstrumentSweep,
  traces: Acquisition['traces'],
  statedEndMs: number,
): Promise<void> {
  const [parameter] = traces.keys();
  if (parameter === undefined) return;
  await talk.sleep(statedEndMs + slackMsOf(sweep) - talk.clock.monotonicMs());
  const later = (await readTraces(talk, sweep, [parameter])).get(parameter);
  if (later?.every((value, index) => Object.is(value, traces.get(parameter)?.[index]))) return;
  throw new DriverError(
    'ANALYZER_DEVICE_ERROR',
    'the instrument called a sweep complete and went on changing its trace: the end of a sweep cannot be told',
    { parameter, statedMs: sweep.passMs * sweep.passesPerStart },
  );
}

/**
 * Polls `*ESR?` until operation complete, or asks or waits as the dialect says. The deadline allows one start to run the whole average, which
 * some instruments do whatever the dialect says; an instrument that is deaf while it sweeps answers the
 * poll only then, so that the poll may take as long.
 */
async function awaitEnd(
  talk: ScpiConversation,
  sweep: InstrumentSweep,
  startedMs: readonly number[],
  answerTimeoutMs: number,
): Promise<void> {
  const begunMs = startedMs.at(-1) ?? talk.clock.monotonicMs();
  const { completion } = talk.dialect;
  if (completion.by === 'wait') {
    const waitMs = sweep.passMs * sweep.passesPerStart * completion.factor + slackMsOf(sweep);
    await talk.sleep(waitMs - (talk.clock.monotonicMs() - begunMs));
    return judgeEvents(talk, await talk.readEvents(answerTimeoutMs), `sweep ${startedMs.length}`);
  }
  const deadlineMs = begunMs + sweep.acquisitionMs * deadlineFactor + slackMsOf(sweep);
  const pause = pollPauses(talk, begunMs + sweep.passMs * sweep.passesPerStart);
  for (;;) {
    await talk.sleep(pause());
    const leftMs = deadlineMs - talk.clock.monotonicMs();
    const events = await talk.readEvents(Math.max(answerTimeoutMs, leftMs));
    await judgeEvents(talk, events, `sweep ${startedMs.length}`);
    if (completion.by === 'poll' ? await hasEnded(talk, completion) : events & eventBits.operationComplete)
      return;
    if (leftMs <= 0) throw await sweepTimeout(talk, sweep, deadlineMs - begunMs);
  }
}

async function hasEnded(
  talk: ScpiConversation,
  { query, until }: Extract<Completion, { by: 'poll' }>,
): Promise<boolean> {
  const answer = await talk.askPlain(query, decodeWord);
  return answer === decodeWord(until) || (until.trim() !== '' && Number(answer) === Number(until));
}

/** Reads the event register, which clears it: an end of before must not be taken for that of the next sweep. */
async function clearEvents(talk: ScpiConversation): Promise<void> {
  for (let read = 0; read < clearingReads; read += 1) {
    const events = await talk.readEvents();
    await judgeEvents(talk, events, 'between two sweeps', { mayBeStale: true });
    if ((events & eventBits.operationComplete) === 0) return;
    // An instrument that keeps the bit over a read may still drop it when told to clear everything.
    if (read > 0) await talk.tellPlain('*CLS');
  }
  throw new DriverError(
    'ANALYZER_DEVICE_ERROR',
    'the event register says without end that an operation is complete: the end of a sweep could not be told',
    { reads: clearingReads },
  );
}

/** Growing pauses, one of which ends just when the sweep should; from there they begin anew, short. */
function pollPauses(talk: ScpiConversation, expectedEndMs: number): () => number {
  let growingMs = firstPollMs;
  const expectedMs = expectedEndMs - talk.clock.monotonicMs();
  const cap = Math.max(longestPollMs, expectedMs * longestPollShare);
  return () => {
    const toEndMs = expectedEndMs - talk.clock.monotonicMs();
    const pauseMs = toEndMs > 0 ? Math.min(growingMs, toEndMs) : growingMs;
    growingMs = toEndMs > 0 && pauseMs >= toEndMs ? firstPollMs : growingMs * pollGrowth;
    growingMs = Math.min(growingMs, toEndMs > 0 ? cap : longestPollMs);
    return Math.max(pauseMs, firstPollMs / 2);
  };
}

async function sweepTimeout(
  talk: ScpiConversation,
  sweep: InstrumentSweep,
  allowedMs: number,
): Promise<DriverError> {
  await talk.tell('abort');
  const facts = { allowedMs: Math.round(allowedMs), statedMs: sweep.acquisitionMs, averages: sweep.averages };
  return new DriverError(
    'ANALYZER_SWEEP_TIMEOUT',
    `an acquisition stated to take ${Math.round(sweep.acquisitionMs)} ms had not ended after ${Math.round(allowedMs)} ms; it was aborted`,
    facts,
  );
}

/**
 * Turns bits of `*ESR?` into the errors they announce. Stale bits, those of errors that were fetched
 * before, have no entry in the queue any more and are no news.
 */
async function judgeEvents(
  talk: ScpiConversation,
  events: number,
  during: string,
  { mayBeStale = false } = {},
): Promise<void> {
  if (events & eventBits.powerOn) {
    throw new DriverError('ANALYZER_POWER_CYCLED', `${during}: the instrument says that it was switched on`, {
      events,
    });
  }
  if ((events & anyErrorBits) === 0) return;
  await talk.throwErrors(during);
  if (mayBeStale) return;
  // The queue may have been read by somebody else, or the instrument keeps none.
  throw new DriverError(
    'ANALYZER_DEVICE_ERROR',
    `${during}: the event register reports an error (${events}) that is not in the error queue`,
    { events },
  );
}

/**
 * When point i was measured on the average: the passes of an average are taken as centred on the mean of
 * their starts, the points as spread evenly over one pass, each in the middle of its own dwell.
 */
function timeLawOf(sweep: InstrumentSweep, startedMs: readonly number[], stopMs: number): TimeLaw {
  const [begunMs = stopMs] = startedMs;
  const { passesPerStart } = sweep;
  // Never later than what was observed: stated times may include what takes place elsewhere.
  const lastStartMs = stopMs - (startedMs.at(-1) ?? stopMs);
  const passMs = Math.min(sweep.passMs, lastStartMs / passesPerStart);
  const meanStartMs = startedMs.reduce((sum, ms) => sum + (ms - begunMs), 0) / Math.max(1, startedMs.length);
  const offsetMs = meanStartMs + ((passesPerStart - 1) / 2) * passMs;
  const halfDwellMs = passMs / sweep.frequenciesHz.length / 2;
  return { kind: 'linear', firstMs: offsetMs + halfDwellMs, lastMs: offsetMs + passMs - halfDwellMs };
}

/** The columns of one trace, of which a frequency must be that of the point; returns (re, im, …). */
async function readTrace(
  talk: ScpiConversation,
  { frequenciesHz }: InstrumentSweep,
  values: Substitutions,
): Promise<Float64Array> {
  const { columns } = talk.dialect;
  const points = frequenciesHz.length;
  const numbers = await talk.askNumbers('dataQuery', columns.length * points, values);
  const column = (name: TraceColumn): Float64Array => {
    const at = columns.indexOf(name);
    return Float64Array.from({ length: points }, (_, i) => numbers[i * columns.length + at]!);
  };
  if (columns.includes('frequency')) requireAxis(frequenciesHz, column('frequency'));
  const [re, im] = [column('re'), column('im')];
  return Float64Array.from({ length: 2 * points }, (_, i) => (i % 2 === 0 ? re : im)[i >> 1]!);
}

/** Selects and reads the wanted parameters, each 2N numbers. */
export async function readTraces(
  talk: ScpiConversation,
  sweep: InstrumentSweep,
  wanted: readonly SParameter[],
): Promise<Acquisition['traces']> {
  const traces = new Map<SParameter, Float64Array>();
  for (const parameter of wanted) {
    // Before every read: another session, or a hand at the panel, may have selected something else.
    const values = { trace: sweep.parameters.indexOf(parameter) + 1, parameter };
    await talk.tell('parameterSelect', values);
    traces.set(parameter, await readTrace(talk, sweep, values));
  }
  // A select that was refused leaves the trace of another parameter in its place.
  await judgeEvents(talk, await talk.readEvents(), 'reading the traces');
  return traces;
}

/**
 * Whether the instrument still has the grid of `setup`. Throws ANALYZER_SETTING_DIFFERS with the fact
 * `afterSweep`: the setting was right before.
 */
export async function confirmUnchanged(
  talk: ScpiConversation,
  setup: SweepSetup,
  sweep: InstrumentSweep,
): Promise<void> {
  try {
    // In blocks the axis costs little and also shows a changed byte order; in decimals three numbers do.
    if (talk.has('frequencyAxisQuery') && talk.traceForm.format !== 'ascii') {
      await confirmAxis(talk, sweep.frequenciesHz);
    } else {
      await confirmGrid(talk, setup);
    }
  } catch (error) {
    if (!isDriverError(error, 'ANALYZER_SETTING_DIFFERS')) throw error;
    throw new DriverError(
      error.code,
      `${error.message}; it was changed after it was set`,
      { ...error.facts, afterSweep: true },
      error,
    );
  }
}
