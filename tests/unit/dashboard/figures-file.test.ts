// A figures file as the page reads it: what is taken, and what is said of a file that does not fit.
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type FiguresView, readFiguresFile } from '../../../dashboard/src/figures-file.ts';

/** Two frequencies, three angles, as DESIGN lays the document out. */
const written = {
  nightcut: 'figures/1',
  run: 12,
  kind: 'pattern',
  state: 'complete',
  antenna: { name: 'gauge', revision: 'C' },
  gainReference: { run: 11, uuid: 'u', antenna: 'dipole' },
  frequenciesHz: [868e6, 870e6],
  markersHz: [868e6],
  cuts: [
    {
      name: 'azimuth',
      plane: 'H',
      anglesDeg: [-10, 0, 10],
      levelDb: [
        [-3, 0, -3],
        [-4, 0, -4],
      ],
      figures: {
        peakDeg: [
          { value: 0.5, U: 0.2 },
          { value: 0.25, bound: 'upper', note: 'near the floor' },
        ],
        squintDeg: [{ absent: 'no half-power beam' }, { absent: 'no half-power beam' }],
      },
    },
  ],
  match: {
    vswr: [{ value: 1.2 }, { value: 1.3 }],
    returnLossDb: [{ value: 20 }, { absent: 'none' }],
    bestMatchHz: { value: 869e6 },
    resonanceHz: { absent: 'stays inductive' },
    lengthScale: { absent: 'no resonance' },
  },
  flags: [{ code: 'DRIFT_LARGE', text: 'boresight moved' }],
};

function read(change: object = {}): FiguresView | { problem: string } {
  return readFiguresFile(JSON.stringify({ ...written, ...change }));
}

function view(change: object = {}): FiguresView {
  const found = read(change);
  if ('problem' in found) throw new Error(found.problem);
  return found;
}

function cutWith(change: object): object {
  return { cuts: [{ ...written.cuts[0], ...change }] };
}

describe('a figures file', () => {
  it('is read: run, cuts, match, flags', () => {
    expect(view()).toEqual({
      run: 12,
      title: 'gauge C',
      state: 'complete',
      gainFrom: 'gain from run 11 (dipole)',
      frequenciesHz: [868e6, 870e6],
      markersHz: [868e6],
      cuts: written.cuts,
      match: written.match,
      flags: ['boresight moved'],
    });
  });

  it('may hold more than the page knows', () => {
    const more = { ...written.cuts[0], colour: 'red', figures: { later: [{ value: 1, unit: 'dB' }] } };
    expect(view({ cuts: [more], weather: {} }).cuts[0]?.figures).toEqual({ later: [{ value: 1 }] });
  });

  it('says how the run ended and where the gain comes from', () => {
    expect(view({ state: 'failed', reason: 'the link dropped' }).state).toBe('failed: the link dropped');
    expect(view({ gainReference: undefined }).gainFrom).toBe('no gain reference');
    expect(view({ kind: 'reference', gainReference: undefined }).gainFrom).toBe('gain reference');
  });

  it('may have no match, no cuts, and a cut with too few samples for a pattern', () => {
    expect(view({ match: undefined })).not.toHaveProperty('match');
    expect(view({ cuts: [] }).cuts).toEqual([]);
    expect(view(cutWith({ anglesDeg: [], levelDb: [] })).cuts[0]?.levelDb).toEqual([]);
  });

  it.each([
    ['a text', 'hello', 'This is no JSON file.'],
    ['nothing', '', 'This is no JSON file.'],
    ['null', 'null', 'holds no figures/1 document'],
    ['a list', '[1]', 'holds no figures/1 document'],
    ['another version', '{"nightcut":"figures/2"}', 'holds no figures/1 document'],
  ])('is refused with the command that writes one: %s', (_, text, says) => {
    const found = readFiguresFile(text);
    expect(found).toEqual({ problem: expect.stringContaining(says) });
    expect(found).toEqual({ problem: expect.stringContaining('nightcut show RUN --json --levels') });
  });

  it.each<[string, object, string]>([
    ['no frequencies', { frequenciesHz: undefined }, 'names no run or no frequencies'],
    ['a frequency that is text', { frequenciesHz: [868e6, '870'] }, 'names no run or no frequencies'],
    ['no run', { run: null }, 'names no run or no frequencies'],
    ['not one sweep', { frequenciesHz: [] }, 'ended before its first sweep'],
    ['no levels', cutWith({ levelDb: undefined }), 'figures without levels'],
    ['a row too few', cutWith({ levelDb: [[-3, 0, -3]] }), 'cut azimuth do not fit'],
    [
      'a level too many',
      cutWith({
        levelDb: [
          [0, 0, 0],
          [0, 0, 0, 0],
        ],
      }),
      'cut azimuth do not fit',
    ],
    [
      'a level that is none',
      cutWith({
        levelDb: [
          [0, 0, 0],
          [0, null, 0],
        ],
      }),
      'cut azimuth do not fit',
    ],
    ['levels without angles', cutWith({ anglesDeg: [] }), 'cut azimuth do not fit'],
    ['angles that are none', cutWith({ anglesDeg: 'all' }), 'cut azimuth do not fit'],
  ])('is refused when it cannot be drawn: %s', (_, change, says) => {
    expect(read(change)).toEqual({ problem: expect.stringContaining(says) });
  });

  it('never throws, whatever stands in a document', () => {
    const part = fc.oneof(fc.jsonValue(), fc.constant(undefined));
    const parts = fc.record({
      run: part,
      antenna: part,
      cuts: part,
      match: part,
      flags: part,
      markersHz: part,
    });
    fc.assert(
      fc.property(parts, (change) => {
        const found = read(change);
        expect('problem' in found || found.frequenciesHz.length === 2).toBe(true);
      }),
      { seed: 868 },
    );
  });
});
