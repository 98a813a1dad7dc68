// The quirks of the quirky instrument: what each means, and an instrument without any. Data only.
import type { ErrorForm, FormatWord, NumberForm } from './quirky-answers.ts';

export interface InstrumentQuirks {
  identity: string;
  lineEnd: '\n' | '\r\n' | '\r';
  /** Said to every visitor. */
  greeting: string | undefined;
  commaBlank: boolean;
  numbers: NumberForm;
  /** Answers begin with the header of the question. */
  headerEcho: boolean;
  booleanWords: boolean;
  formatWord: FormatWord;
  /** NORMAL for NORM. */
  longWords: boolean;
  errorForm: ErrorForm;
  errorQueue: number;
  sweepMs: number;
  /** What comes during a sweep is obeyed when it has ended. */
  deafWhileSweeping: boolean;
  /** Bit 0 of the event register is set when the instrument is first met. */
  staleOperationComplete: boolean;
  /** Reading the event register leaves bit 0 in it; `until-cleared`: `*CLS` takes it away. */
  completeSticks: 'no' | 'until-cleared' | 'for-ever';
  /** Knows `*OPC`. */
  operationComplete: boolean;
  /** Calls an operation complete that has only begun. */
  completeAtOnce: boolean;
  /** What it states in place of the time that a sweep takes. */
  statedSweepMs: number | undefined;
  averaging: 'by-point' | 'start-each' | 'start-all';
  /** What it has; undefined: any. */
  bandwidths: readonly number[] | undefined;
  frequencyDigits: 'hertz' | 'fifteen';
  /** Headers (`CALC:X?`) that it does not know. */
  unknown: readonly string[];
  sweepTime: 'stated' | 'zero' | 'nan' | 'overflow' | 'milliseconds';
  /** What follows a block. */
  blockTail: string;
  lengthDigits: number;
  /** Largest piece of an answer that leaves at once. */
  pieceBytes: number;
  /** In the middle of each block. */
  pauseMs: number;
  /** Before the answer to the n-th message. */
  answerDelayMs: (message: number) => number;
  /** The n-th block (from 1) is cut in half, and the link with it. */
  halfBlockAt: number | undefined;
  /** What a second visitor meets while the first is there, or was there less than `lingerMs` ago. */
  sessions: 'any' | 'refused' | 'mute';
  lingerMs: number;
  muteAfterReconnectMs: number;
  bootMs: number;
  powerOnError: boolean;
  powerOnBit: boolean;
  /** Accepts visitors and never says a word. */
  silent: boolean;
  sourceStuck: boolean;
  /** Old traces stay readable after a change; otherwise −230. */
  oldDataReadable: boolean;
}

export const plainInstrument: InstrumentQuirks = {
  identity: 'FICTIVE,SWEEPBOX 2,0042,3.1',
  lineEnd: '\n',
  greeting: undefined,
  commaBlank: false,
  numbers: 'plain',
  headerEcho: false,
  booleanWords: false,
  formatWord: 'both',
  longWords: false,
  errorForm: 'quoted',
  errorQueue: 16,
  sweepMs: 150,
  deafWhileSweeping: false,
  staleOperationComplete: false,
  completeSticks: 'no',
  operationComplete: true,
  completeAtOnce: false,
  statedSweepMs: undefined,
  averaging: 'by-point',
  bandwidths: undefined,
  frequencyDigits: 'fifteen',
  unknown: [],
  sweepTime: 'stated',
  blockTail: '\n',
  lengthDigits: 0,
  pieceBytes: Number.POSITIVE_INFINITY,
  pauseMs: 0,
  answerDelayMs: () => 0,
  halfBlockAt: undefined,
  sessions: 'any',
  lingerMs: 0,
  muteAfterReconnectMs: 0,
  bootMs: 2_000,
  powerOnError: false,
  powerOnBit: true,
  silent: false,
  sourceStuck: false,
  oldDataReadable: false,
};
