// Gain by transfer: the AUT against a reference antenna whose gain is known, on the same range.
//
//   realized G_aut = realized G_ref + Δ|S21| + ΔL + 20 log(R_aut/R_ref)
//   IEEE gain      = realized gain − 10 log(1 − |Γ|²)        (mismatch loss added back)
//
// Symbols: G gain in dBi, S21 transmission, L loss of cable and pads, R range length, Γ reflection coefficient.
import { amplitudeDb } from './decibels.ts';
import { absentFigure, type Figure, valueFigure } from './figure.ts';
import { mismatchLossDb } from './match.ts';
import { finite, PatternError, positive } from './pattern-error.ts';

/** One line of a gain table. */
export interface GainPoint {
  frequencyHz: number;
  gainDbi: number;
}

/** What a gain table states: gain of IEEE Std 145 (no mismatch), or realized gain (with it). */
export type StatedGain = 'ieee' | 'realized';

export interface GainTransfer {
  /** Realized gain of the reference antenna in dBi. */
  referenceGainDbi: number;
  /** Received level with the reference antenna at its peak, 20 log|S21|, in dB. */
  referenceLevelDb: number;
  /** Loss in the AUT's path that was not in the reference's (longer cable, added pad), in dB; 0 unless given. */
  addedLossDb?: number;
  /** Range lengths in m with reference and with AUT; equal unless given. */
  referenceRangeLengthM?: number;
  autRangeLengthM?: number;
}

/**
 * Gain of a table at a frequency, linear in dB over frequency, never beyond its ends.
 *
 * @param table lines ascending in frequency, in Hz and dBi
 * @param frequencyHz where the gain is wanted
 * @returns gain in dBi, of the kind the table states
 * @throws PatternError for a frequency outside the table (widen the table or narrow the band), an empty
 *   table, or lines out of order
 * Source: common practice, no source. Checked: tests/unit/daemon/pattern/gain-transfer.test.ts.
 */
export function tableGainDbi(table: readonly GainPoint[], frequencyHz: number): number {
  checkTable(table);
  const first = table[0]!;
  const last = table.at(-1)!;
  if (!(frequencyHz >= first.frequencyHz && frequencyHz <= last.frequencyHz)) {
    throw new PatternError(
      `The gain table from ${first.frequencyHz} Hz to ${last.frequencyHz} Hz does not reach ${frequencyHz} Hz; widen the table or narrow the band.`,
      {
        frequencyHz: String(frequencyHz),
        tableStartHz: first.frequencyHz,
        tableStopHz: last.frequencyHz,
      },
    );
  }
  const after = table.findIndex((point) => point.frequencyHz >= frequencyHz);
  const upper = table[after]!;
  const lower = table[Math.max(0, after - 1)]!;
  if (upper.frequencyHz === lower.frequencyHz) return upper.gainDbi;
  const share = (frequencyHz - lower.frequencyHz) / (upper.frequencyHz - lower.frequencyHz);
  return lower.gainDbi * (1 - share) + upper.gainDbi * share;
}

/**
 * Realized gain from a stated gain.
 *
 * @param gainDbi gain as the table states it, in dBi
 * @param stated `ieee` takes off the mismatch loss; `realized` stands as it is
 * @param gammaMagnitude |Γ| of that antenna as measured, 0 or more; needed for `ieee` alone
 * @returns realized gain in dBi; absent when |Γ| is 1 or more, or was not measured
 * Source: IEEE Std 145 (gain, realized gain). Checked: tests/outside (C-SUBST).
 */
export function realizedGainDbi(gainDbi: number, stated: StatedGain, gammaMagnitude?: number): Figure {
  finite('gainDbi', gainDbi);
  if (stated === 'realized') return valueFigure(gainDbi);
  if (gammaMagnitude === undefined) {
    return absentFigure('the table states IEEE gain, and the reflection of the antenna was not measured');
  }
  const loss = mismatchLossDb(gammaMagnitude);
  return loss.kind === 'value' ? valueFigure(gainDbi - loss.value) : loss;
}

/**
 * IEEE gain from realized gain: the mismatch loss is added back.
 *
 * @param realizedDbi realized gain in dBi
 * @param gammaMagnitude |Γ| of the antenna as measured, 0 or more
 * @returns gain in dBi; absent when |Γ| is 1 or more
 * Source: IEEE Std 145 (gain, realized gain). Checked: tests/outside (C-SUBST).
 */
export function ieeeGainDbi(realizedDbi: number, gammaMagnitude: number): Figure {
  finite('realizedDbi', realizedDbi);
  const loss = mismatchLossDb(gammaMagnitude);
  return loss.kind === 'value' ? valueFigure(realizedDbi + loss.value) : loss;
}

/**
 * What turns a received level of the AUT into realized gain: gain = level + constant.
 *
 * @param transfer gain and level of the reference, and what differs between the two set-ups
 * @returns the constant in dB at that frequency
 * @throws PatternError for numbers that are not finite, or a range length that is not above zero
 * Source: IEEE Std 149 (gain-transfer method). Checked: tests/outside (C-SUBST).
 */
export function gainConstantDb(transfer: GainTransfer): number {
  const gainDbi = finite('referenceGainDbi', transfer.referenceGainDbi);
  const levelDb = finite('referenceLevelDb', transfer.referenceLevelDb);
  const lossDb = finite('addedLossDb', transfer.addedLossDb ?? 0);
  return gainDbi - levelDb + lossDb + spreadingDb(transfer);
}

function spreadingDb({ autRangeLengthM, referenceRangeLengthM }: GainTransfer): number {
  if (autRangeLengthM === undefined && referenceRangeLengthM === undefined) return 0;
  if (autRangeLengthM === undefined || referenceRangeLengthM === undefined) {
    throw new PatternError('One range length alone is given; hand in both, or none where they are equal.', {
      autRangeLengthM: String(autRangeLengthM),
      referenceRangeLengthM: String(referenceRangeLengthM),
    });
  }
  return amplitudeDb(
    positive('autRangeLengthM', autRangeLengthM) / positive('referenceRangeLengthM', referenceRangeLengthM),
  );
}

function checkTable(table: readonly GainPoint[]): void {
  if (table.length === 0) throw new PatternError('The gain table is empty; hand in its lines.');
  table.forEach((point, k) => {
    finite('gainDbi', positive('frequencyHz', point.frequencyHz) && point.gainDbi);
    if (k > 0 && point.frequencyHz <= table[k - 1]!.frequencyHz) {
      throw new PatternError(
        `The gain table is out of order at ${point.frequencyHz} Hz; hand in ascending frequencies.`,
        { frequencyHz: point.frequencyHz },
      );
    }
  });
}
