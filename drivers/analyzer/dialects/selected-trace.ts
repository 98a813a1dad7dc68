// S-parameters by traces whose number stands in every header, also in the question for data: nothing is selected
// that somebody else could select away. Sweeping is a mode: held, or one sweep.
import type { ScpiDialect } from '../scpi-templates.ts';
import { commonShape, commonTemplates } from './common-shape.ts';

export const selectedTrace: ScpiDialect = {
  ...commonShape,
  name: 'selected-trace',
  templates: {
    ...commonTemplates,
    continuousOff: ':SENS{channel}:SWE:MODE HOLD',
    continuousQuery: ':SENS{channel}:SWE:MODE?',
    startSweep: ':SENS{channel}:SWE:MODE SING',
    parameterClear: ':CALC{channel}:MEAS:DEL:ALL',
    parameterDefine: ":CALC{channel}:MEAS{trace}:DEF '{parameter}'",
    parameterDefineQuery: ':CALC{channel}:MEAS{trace}:DEF?',
    dataQuery: ':CALC{channel}:MEAS{trace}:DATA:SDAT?',
    frequencyAxisQuery: ':CALC{channel}:MEAS{trace}:X?',
  },
};
