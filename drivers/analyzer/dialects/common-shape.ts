// What the built-in dialects have in common: stimulus, averaging, trace format, errors. How S-parameters are
// chosen and sweeps are started is each dialect's own.
import type { ScpiDialect } from '../scpi-templates.ts';

/**
 * Averaging is asked for by point, for then one start means one thing everywhere; where the instrument
 * averages whole sweeps only, one start is taken to run one of them: were it the whole average, N starts would
 * only cost time, whereas one too few would pass an unfinished average off as a finished one.
 */
export const commonShape = {
  channel: 1,
  oneStartRuns: 'one-sweep',
  completion: { by: 'operation-complete-bit' },
  columns: ['re', 'im'],
  mayBeUnknown: [
    'triggerImmediate',
    'sweepTypeLinear',
    'averagingByPoint',
    'averagingModeQuery',
    'sweepTimeQuery',
    'frequencyAxisQuery',
    'continuousQuery',
    'byteOrderQuery',
    'correctionQuery',
  ],
} as const satisfies Omit<ScpiDialect, 'name' | 'templates'>;

export const commonTemplates = {
  startFrequency: ':SENS{channel}:FREQ:STAR {value}',
  startFrequencyQuery: ':SENS{channel}:FREQ:STAR?',
  stopFrequency: ':SENS{channel}:FREQ:STOP {value}',
  stopFrequencyQuery: ':SENS{channel}:FREQ:STOP?',
  points: ':SENS{channel}:SWE:POIN {value}',
  pointsQuery: ':SENS{channel}:SWE:POIN?',
  ifBandwidth: ':SENS{channel}:BAND {value}',
  ifBandwidthQuery: ':SENS{channel}:BAND?',
  power: ':SOUR{channel}:POW {value}',
  powerQuery: ':SOUR{channel}:POW?',
  output: ':OUTP {onOff}',
  outputQuery: ':OUTP?',
  abort: ':ABOR',
  averagingState: ':SENS{channel}:AVER {onOff}',
  averagingStateQuery: ':SENS{channel}:AVER?',
  averagingCount: ':SENS{channel}:AVER:COUN {value}',
  averagingCountQuery: ':SENS{channel}:AVER:COUN?',
  averagingClear: ':SENS{channel}:AVER:CLE',
  averagingByPoint: ':SENS{channel}:AVER:MODE POIN',
  averagingModeQuery: ':SENS{channel}:AVER:MODE?',
  sweepTypeLinear: ':SENS{channel}:SWE:TYPE LIN',
  triggerImmediate: ':TRIG:SOUR IMM',
  sweepTimeQuery: ':SENS{channel}:SWE:TIME?',
  formatReal64: ':FORM REAL,64',
  formatReal32: ':FORM REAL,32',
  formatAscii: ':FORM ASC',
  formatQuery: ':FORM?',
  byteOrderNormal: ':FORM:BORD NORM',
  byteOrderSwapped: ':FORM:BORD SWAP',
  byteOrderQuery: ':FORM:BORD?',
  correctionQuery: ':SENS{channel}:CORR?',
  errorQuery: ':SYST:ERR?',
} as const satisfies Partial<ScpiDialect['templates']>;
