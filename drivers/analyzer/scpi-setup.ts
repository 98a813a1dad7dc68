// A sweep's settings to the instrument and back: everything is sent, everything is read back, and what
// the instrument accepted is compared with what was asked, for it coerces values without a word.
import { DriverError } from '../errors.ts';
import type { PreparedSweep, SweepSetup } from './analyzer.ts';
import type { ScpiConversation } from './scpi-conversation.ts';
import { errorOf, undefinedHeader } from './scpi-status.ts';
import type { TemplateName } from './scpi-templates.ts';

/** Read-back is printed with 7 digits at worst; a synthesizer's own steps are finer than this. */
const frequencyTolerance = 1e-6;
/** Axes in single precision or short decimals are coarser than the grid they stand for. */
const axisTolerance = 5e-6;
const bandwidthTolerance = 1e-3;
const powerToleranceDb = 0.01;

export interface InstrumentSweep extends PreparedSweep {
  startHz: number;
  stopHz: number;
  /** One way through all points, as the instrument states it; N times as long where it averages by point. */
  passMs: number;
  /** Starts that make one acquisition, and passes that each of them runs. */
  starts: number;
  passesPerStart: number;
  /** These times are the instrument's own, not an estimate of ours. */
  isStated: boolean;
}

type Course = Pick<InstrumentSweep, 'passMs' | 'starts' | 'passesPerStart' | 'isStated' | 'acquisitionMs'>;

/**
 * Sends the whole setup and proves it. Throws ANALYZER_COMMAND_REFUSED, ANALYZER_SETTING_DIFFERS (facts:
 * setting, asked, got), ANALYZER_BAD_DIALECT, and what the session throws.
 */
export async function applySetup(talk: ScpiConversation, setup: SweepSetup): Promise<InstrumentSweep> {
  // Errors of before are not ours: left there, they would be laid to the first batch.
  await talk.drain();
  await applyModes(talk);
  await applySweep(talk, setup);
  await applyParameters(talk, setup);
  const course = await applyAveraging(talk, setup);
  await confirmModes(talk, setup);
  const sweep = { ...(await confirmSweep(talk, setup)), ...course };
  await confirmParameters(talk, setup);
  await talk.throwErrors('the read-back of the settings');
  return sweep;
}

async function applyModes(talk: ScpiConversation): Promise<void> {
  const { format, byteOrder } = talk.traceForm;
  await talk.tell('abort');
  await talk.tell('continuousOff');
  await talk.tell(demand(talk, formatTemplates[format]));
  if (format !== 'ascii') {
    if (byteOrder === 'swapped') await talk.tell(demand(talk, 'byteOrderSwapped'));
    else await talk.tell('byteOrderNormal');
  }
  await talk.throwErrors('single sweeps and trace format');
  await tellIfKnown(talk, 'triggerImmediate');
  await tellIfKnown(talk, 'sweepTypeLinear');
}

const formatTemplates = { real64: 'formatReal64', real32: 'formatReal32', ascii: 'formatAscii' } as const;

function demand(talk: ScpiConversation, name: TemplateName): TemplateName {
  if (talk.has(name)) return name;
  throw new DriverError(
    'ANALYZER_BAD_DIALECT',
    `the trace format of the range file needs '${name}', which the dialect ${talk.dialect.name} does not have`,
    { template: name, dialect: talk.dialect.name },
  );
}

/**
 * Sends a command by itself; "unknown command" is accepted where the dialect says that it may be. Tells
 * whether the instrument knew it.
 */
async function tellIfKnown(talk: ScpiConversation, name: TemplateName): Promise<boolean> {
  if (!talk.has(name)) return false;
  await talk.tell(name);
  const entries = await talk.drain();
  const harmless = talk.dialect.mayBeUnknown.includes(name);
  const error = errorOf(
    entries.filter(({ code }) => !(harmless && code === undefinedHeader)),
    name,
  );
  if (error) throw error;
  return entries.every(({ code }) => code !== undefinedHeader);
}

async function applySweep(talk: ScpiConversation, setup: SweepSetup): Promise<void> {
  const { startHz, stopHz } = setup;
  // The edges must never cross, not even between two commands: some instruments refuse that, others move
  // the other edge along.
  if (startHz >= (await talk.askNumber('stopFrequencyQuery'))) {
    await talk.tell('stopFrequency', { value: stopHz });
    await talk.tell('startFrequency', { value: startHz });
  } else {
    await talk.tell('startFrequency', { value: startHz });
    await talk.tell('stopFrequency', { value: stopHz });
  }
  await talk.tell('points', { value: setup.points });
  await talk.tell('ifBandwidth', { value: setup.ifBandwidthHz });
  await talk.tell('power', { value: setup.powerDbm });
  await talk.tell('averagingState', { onOff: 'OFF' });
  await talk.throwErrors('frequencies, points, bandwidth and power');
}

async function applyParameters(talk: ScpiConversation, { parameters }: SweepSetup): Promise<void> {
  await talk.tell('parameterClear');
  await talk.tell('parameterCount', { count: parameters.length });
  for (const [index, parameter] of parameters.entries()) {
    await talk.tell('parameterDefine', { trace: index + 1, parameter });
  }
  await talk.throwErrors('the definition of the S-parameters');
}

/**
 * Averaging, and what follows from it for the course of an acquisition. The sweep time is asked while
 * averaging is still off: what it covers afterwards is the maker's choice.
 */
async function applyAveraging(talk: ScpiConversation, setup: SweepSetup): Promise<Course> {
  const { averages } = setup;
  const statedMs = await askSweepMs(talk);
  const sweepMs = statedMs ?? estimatedSweepMs(setup);
  const acquisitionMs = sweepMs * averages;
  const all = { acquisitionMs, isStated: statedMs !== undefined };
  if (averages === 1) return { ...all, passMs: sweepMs, starts: 1, passesPerStart: 1 };
  // Without proof that it averages by point it is taken to need N starts, which only cost time if it does.
  const byPoint =
    (await tellIfKnown(talk, 'averagingByPoint')) &&
    talk.has('averagingModeQuery') &&
    (await talk.askWord('averagingModeQuery')).startsWith('POIN');
  await talk.tell(demand(talk, 'averagingCount'), { value: averages });
  await talk.tell(demand(talk, 'averagingState'), { onOff: 'ON' });
  await talk.throwErrors('averaging');
  if (byPoint) return { ...all, passMs: acquisitionMs, starts: 1, passesPerStart: 1 };
  return talk.dialect.oneStartRuns === 'whole-average'
    ? { ...all, passMs: sweepMs, starts: 1, passesPerStart: averages }
    : { ...all, passMs: sweepMs, starts: averages, passesPerStart: 1 };
}

/** Throws ANALYZER_SETTING_DIFFERS unless `got` is what was asked. */
export function requireSetting(
  setting: string,
  asked: number | string | boolean,
  got: number | string | boolean,
  tolerance = 0,
): void {
  const same =
    typeof asked === 'number' && typeof got === 'number' ? Math.abs(asked - got) <= tolerance : asked === got;
  if (same) return;
  throw new DriverError(
    'ANALYZER_SETTING_DIFFERS',
    `${setting}: ${asked} was asked for, the instrument has ${got}`,
    { setting, asked, got },
  );
}

async function confirmModes(talk: ScpiConversation, { averages }: SweepSetup): Promise<void> {
  const { format, byteOrder } = talk.traceForm;
  if (talk.has('continuousQuery')) {
    requireSetting('continuous sweep', false, await talk.askContinuous());
  }
  if (talk.has('sweepTypeQuery')) {
    requireSetting('sweep type', 'LIN', (await talk.askWord('sweepTypeQuery')).slice(0, 3));
  }
  if (talk.has('formatQuery')) {
    const got = formatOf(await talk.askWord('formatQuery'));
    // Without its bits the word says less; the length of every block then tells.
    if (got !== 'REAL' || format === 'ascii') requireSetting('trace format', format, got);
  }
  if (format !== 'ascii' && talk.has('byteOrderQuery')) {
    const word = await talk.askWord('byteOrderQuery');
    const got = word.startsWith('SWAP') ? 'swapped' : word.startsWith('NORM') ? 'normal' : word;
    requireSetting('byte order', byteOrder, got);
  }
  if (talk.has('averagingStateQuery')) {
    requireSetting('averaging', averages > 1, await talk.askBoolean('averagingStateQuery'));
  }
  if (averages > 1 && talk.has('averagingCountQuery')) {
    requireSetting('averages', averages, await talk.askNumber('averagingCountQuery'));
  }
}

/** `REAL,64`, `REAL,+32`, `REAL64`, `ASC`, `ASCII,0` … in one of our words; anything else as it is. */
function formatOf(word: string): string {
  if (word.startsWith('ASC')) return 'ascii';
  const bits = /^REAL,?\+?(\d+)$/.exec(word)?.[1];
  return bits === undefined ? word : `real${bits}`;
}

async function confirmSweep(
  talk: ScpiConversation,
  setup: SweepSetup,
): Promise<Omit<InstrumentSweep, keyof Course>> {
  const { startHz, stopHz } = await confirmGrid(talk, setup);
  const ifBandwidthHz = await talk.askNumber('ifBandwidthQuery');
  requireSetting(
    'IF bandwidth (Hz)',
    setup.ifBandwidthHz,
    ifBandwidthHz,
    setup.ifBandwidthHz * bandwidthTolerance,
  );
  const powerDbm = await talk.askNumber('powerQuery');
  requireSetting('power (dBm)', setup.powerDbm, powerDbm, powerToleranceDb);
  return {
    startHz,
    stopHz,
    frequenciesHz: linearGrid(startHz, stopHz, setup.points),
    ifBandwidthHz,
    powerDbm,
    averages: setup.averages,
    parameters: setup.parameters,
  };
}

/** Start, stop and points as the instrument has them now, compared with the setup. */
export async function confirmGrid(
  talk: ScpiConversation,
  setup: Pick<SweepSetup, 'startHz' | 'stopHz' | 'points'>,
): Promise<{ startHz: number; stopHz: number }> {
  requireSetting('points', setup.points, await talk.askNumber('pointsQuery'));
  const startHz = await talk.askNumber('startFrequencyQuery');
  requireSetting('start frequency (Hz)', setup.startHz, startHz, setup.startHz * frequencyTolerance);
  const stopHz = await talk.askNumber('stopFrequencyQuery');
  requireSetting('stop frequency (Hz)', setup.stopHz, stopHz, setup.stopHz * frequencyTolerance);
  return { startHz, stopHz };
}

/** The axis as the instrument reports it, compared point by point; also shows a wrong byte order. */
export async function confirmAxis(talk: ScpiConversation, frequenciesHz: Float64Array): Promise<void> {
  requireAxis(frequenciesHz, await talk.askNumbers('frequencyAxisQuery', frequenciesHz.length, { trace: 1 }));
}

/** Throws ANALYZER_SETTING_DIFFERS unless each point of `axis` is the one of the setup. */
export function requireAxis(frequenciesHz: Float64Array, axis: Float64Array): void {
  for (const [index, asked] of frequenciesHz.entries()) {
    requireSetting(`frequency of point ${index + 1} (Hz)`, asked, axis[index]!, asked * axisTolerance);
  }
}

/** N frequencies from start to stop, both ends included. */
export function linearGrid(startHz: number, stopHz: number, points: number): Float64Array {
  const stepHz = points > 1 ? (stopHz - startHz) / (points - 1) : 0;
  return Float64Array.from({ length: points }, (_, index) =>
    index === points - 1 && points > 1 ? stopHz : startHz + index * stepHz,
  );
}

/** One sweep as the instrument states it; undefined where it states none, or one that rounds to nothing. */
async function askSweepMs(talk: ScpiConversation): Promise<number | undefined> {
  const statedS = talk.has('sweepTimeQuery') ? await talk.askStated('sweepTimeQuery') : undefined;
  return statedS !== undefined && statedS > 0 ? 1000 * statedS : undefined;
}

/** From the filter's settling alone. */
function estimatedSweepMs({ points, ifBandwidthHz }: SweepSetup): number {
  return points * (1 + 2000 / ifBandwidthHz);
}

async function confirmParameters(talk: ScpiConversation, { parameters }: SweepSetup): Promise<void> {
  if (talk.has('parameterCountQuery')) {
    requireSetting('number of S-parameters', parameters.length, await talk.askNumber('parameterCountQuery'));
  }
  if (talk.has('parameterListQuery')) {
    const list = (await talk.askWord('parameterListQuery')).match(/\bS[12][12]\b/g) ?? [];
    requireSetting('S-parameters', parameters.toSorted().join(), list.toSorted().join());
  }
  if (!talk.has('parameterDefineQuery')) return;
  for (const [index, parameter] of parameters.entries()) {
    requireSetting(
      `S-parameter of trace ${index + 1}`,
      parameter,
      await talk.askWord('parameterDefineQuery', { trace: index + 1 }),
    );
  }
}
