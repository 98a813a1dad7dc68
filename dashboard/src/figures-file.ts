// A file of the documented format `figures/1`, read as an outside program would: what the page needs is
// checked, what it does not know is left alone.

export interface Entry {
  value?: number;
  bound?: 'upper' | 'lower';
  absent?: string;
}

export interface CutView {
  name: string;
  plane: string;
  anglesDeg: number[];
  /** One row per frequency, one level per angle. */
  levelDb: number[][];
  figures: Record<string, Entry[]>;
}

export interface FiguresView {
  run: number;
  title: string;
  state: string;
  frequenciesHz: number[];
  markersHz: number[];
  cuts: CutView[];
  returnLossDb: Entry[];
  flags: string[];
}

type Loose = Record<string, unknown>;

/** The view, or one line that says what is wrong with the file. */
export function readFiguresFile(text: string): FiguresView | { problem: string } {
  let document: Loose;
  try {
    document = JSON.parse(text);
  } catch {
    return { problem: 'This is no JSON file. Write one with: nightcut show RUN --json --levels' };
  }
  if (document?.['nightcut'] !== 'figures/1') {
    return {
      problem: 'This file holds no figures/1 document. Write one with: nightcut show RUN --json --levels',
    };
  }
  const cuts = listOf(document['cuts']).map(cutView);
  if (cuts.length > 0 && cuts.every((cut) => cut.levelDb.length === 0)) {
    return {
      problem: 'The file holds figures without levels. Write it with: nightcut show RUN --json --levels',
    };
  }
  const antenna = (document['antenna'] ?? {}) as Loose;
  const match = (document['match'] ?? {}) as Loose;
  return {
    run: Number(document['run']),
    title: `${String(antenna['name'] ?? '')} ${String(antenna['revision'] ?? '')}`.trim(),
    state: String(document['state'] ?? ''),
    frequenciesHz: numbersOf(document['frequenciesHz']),
    markersHz: numbersOf(document['markersHz']),
    cuts,
    returnLossDb: listOf(match['returnLossDb']) as Entry[],
    flags: listOf(document['flags']).map((flag) => String(flag['text'] ?? '')),
  };
}

function cutView(cut: Loose): CutView {
  return {
    name: String(cut['name'] ?? ''),
    plane: String(cut['plane'] ?? ''),
    anglesDeg: numbersOf(cut['anglesDeg']),
    levelDb: Array.isArray(cut['levelDb']) ? cut['levelDb'].map(numbersOf) : [],
    figures: (cut['figures'] ?? {}) as Record<string, Entry[]>,
  };
}

function listOf(value: unknown): Loose[] {
  return Array.isArray(value) ? value : [];
}

function numbersOf(value: unknown): number[] {
  return Array.isArray(value) ? value.filter((item) => typeof item === 'number') : [];
}
