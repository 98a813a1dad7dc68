// S-parameters by measurements with names: what is there is thrown away, each is made anew and put into a window
// (some instruments sweep only what is shown), and data are read of the one selected by its name.
import type { ScpiDialect } from '../scpi-templates.ts';
import { commonShape, commonTemplates } from './common-shape.ts';

export const namedMeasurement: ScpiDialect = {
  ...commonShape,
  name: 'named-measurement',
  templates: {
    ...commonTemplates,
    continuousOff: ':INIT{channel}:CONT OFF',
    continuousQuery: ':INIT{channel}:CONT?',
    startSweep: ':INIT{channel}:IMM',
    parameterClear: ':CALC{channel}:PAR:DEL:ALL',
    parameterDefine: [
      ":CALC{channel}:PAR:DEF 'NC{trace}',{parameter}",
      ":DISP:WIND{channel}:TRAC{trace}:FEED 'NC{trace}'",
    ],
    parameterListQuery: ':CALC{channel}:PAR:CAT?',
    parameterSelect: ":CALC{channel}:PAR:SEL 'NC{trace}'",
    dataQuery: ':CALC{channel}:DATA? SDATA',
    frequencyAxisQuery: ':CALC{channel}:X?',
  },
};
