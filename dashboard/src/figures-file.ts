// A file of the documented format `figures/1`, read as an outside program would: what the page needs is
// checked, what it does not know is left alone.

export interface Entry {
  value?: number;
  /** Half width of the 95 % interval. */
  U?: number;
  bound?: 'upper' | 'lower';
  note?: string;
  absent?: string;
}

export interface CutView {
  name: string;
  plane: string;
  anglesDeg: number[];
  /** One row per frequency, one level per angle; no rows where the cut has too few samples. */
  levelDb: number[][];
  figures: Record<string, Entry[]>;
}

export interface MatchView {
  vswr: Entry[];
  returnLossDb: Entry[];
  bestMatchHz: Entry;
  resonanceHz: Entry;
  lengthScale: Entry;
}

export interface FiguresView {
  run: number;
  title: string;
  /** How the run ended, and where the gain comes from, in words. */
  state: string;
  gainFrom: string;
  frequenciesHz: number[];
  markersHz: number[];
  cuts: CutView[];
  match?: MatchView;
  flags: string[];
}

type Loose = Record<string, unknown>;

const remedy = 'Write one with: nightcut show RUN --json --levels';

/** The view, or one line that says what is wrong with the file. */
export function readFiguresFile(text: string): FiguresView | { problem: string } {
  let document: Loose;
  try {
    document = objectOf(JSON.parse(text));
  } catch {
    return { problem: `This is no JSON file. ${remedy}` };
  }
  if (document['nightcut'] !== 'figures/1') {
    return { problem: `This file holds no figures/1 document. ${remedy}` };
  }
  const frequenciesHz = numbersOf(document['frequenciesHz']);
  const cuts = listOf(document['cuts']);
  const problem = problemOf(document, cuts, frequenciesHz);
  return problem === undefined ? viewOf(document, cuts, frequenciesHz ?? []) : { problem };
}

function problemOf(
  document: Loose,
  cuts: readonly Loose[],
  frequenciesHz: number[] | undefined,
): string | undefined {
  const damaged = 'The file is damaged; write it again.';
  if (!frequenciesHz || typeof document['run'] !== 'number') {
    return `The file names no run or no frequencies. ${damaged}`;
  }
  if (frequenciesHz.length === 0)
    return 'The run in this file ended before its first sweep: nothing to show.';
  if (cuts.some((cut) => cut['levelDb'] === undefined)) {
    return 'The file holds figures without levels. Write it with: nightcut show RUN --json --levels';
  }
  const unfit = cuts.find((cut) => !levelsFit(cut, frequenciesHz.length));
  if (!unfit) return undefined;
  return `The levels of the cut ${textOf(unfit['name'])} do not fit its angles and frequencies. ${damaged}`;
}

function levelsFit(cut: Loose, frequencies: number): boolean {
  const angles = numbersOf(cut['anglesDeg']);
  const rows = cut['levelDb'];
  if (!angles || !Array.isArray(rows)) return false;
  if (angles.length === 0) return rows.length === 0;
  return rows.length === frequencies && rows.every((row) => numbersOf(row)?.length === angles.length);
}

function viewOf(document: Loose, cuts: readonly Loose[], frequenciesHz: number[]): FiguresView {
  const antenna = objectOf(document['antenna']);
  const reason = textOf(document['reason']);
  return {
    run: Number(document['run']),
    title: `${textOf(antenna['name'])} ${textOf(antenna['revision'])}`.trim(),
    state: `${textOf(document['state'])}${reason ? `: ${reason}` : ''}`,
    gainFrom: gainFrom(document),
    frequenciesHz,
    markersHz: numbersOf(document['markersHz']) ?? [],
    cuts: cuts.map(cutView),
    ...(document['match'] === undefined ? {} : { match: matchView(objectOf(document['match'])) }),
    flags: listOf(document['flags']).map((flag) => textOf(flag['text'])),
  };
}

function gainFrom(document: Loose): string {
  if (document['kind'] === 'reference') return 'gain reference';
  if (document['gainReference'] === undefined) return 'no gain reference';
  const reference = objectOf(document['gainReference']);
  return `gain from run ${String(reference['run'])} (${textOf(reference['antenna'])})`;
}

function cutView(cut: Loose): CutView {
  const figures = Object.entries(objectOf(cut['figures']));
  return {
    name: textOf(cut['name']),
    plane: textOf(cut['plane']),
    anglesDeg: numbersOf(cut['anglesDeg']) ?? [],
    levelDb: Array.isArray(cut['levelDb']) ? cut['levelDb'].map((row) => numbersOf(row) ?? []) : [],
    figures: Object.fromEntries(figures.map(([key, entries]) => [key, listOf(entries).map(entryOf)])),
  };
}

function matchView(match: Loose): MatchView {
  return {
    vswr: listOf(match['vswr']).map(entryOf),
    returnLossDb: listOf(match['returnLossDb']).map(entryOf),
    bestMatchHz: entryOf(match['bestMatchHz']),
    resonanceHz: entryOf(match['resonanceHz']),
    lengthScale: entryOf(match['lengthScale']),
  };
}

function entryOf(value: unknown): Entry {
  const { value: number, U, bound, note, absent } = objectOf(value);
  return {
    ...(typeof number === 'number' ? { value: number } : {}),
    ...(typeof U === 'number' ? { U } : {}),
    ...(bound === 'upper' || bound === 'lower' ? { bound } : {}),
    ...(typeof note === 'string' ? { note } : {}),
    ...(typeof absent === 'string' ? { absent } : {}),
  };
}

function objectOf(value: unknown): Loose {
  return typeof value === 'object' && value !== null ? (value as Loose) : {};
}

function listOf(value: unknown): Loose[] {
  return Array.isArray(value) ? value.map(objectOf) : [];
}

/** Undefined unless every item is a number: leaving some out would move the others. */
function numbersOf(value: unknown): number[] | undefined {
  return Array.isArray(value) && value.every((item) => typeof item === 'number') ? value : undefined;
}

function textOf(value: unknown): string {
  return typeof value === 'string' ? value : '';
}
