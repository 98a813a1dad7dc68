// S-parameters by number of a trace: their count is set, each is defined, and data are read of the selected one.
import type { ScpiDialect } from '../scpi-templates.ts';
import { commonShape, commonTemplates } from './common-shape.ts';

export const numberedParameter: ScpiDialect = {
  ...commonShape,
  name: 'numbered-parameter',
  templates: {
    ...commonTemplates,
    continuousOff: ':INIT{channel}:CONT OFF',
    continuousQuery: ':INIT{channel}:CONT?',
    startSweep: ':INIT{channel}',
    parameterCount: ':CALC{channel}:PAR:COUN {count}',
    parameterCountQuery: ':CALC{channel}:PAR:COUN?',
    parameterDefine: ':CALC{channel}:PAR{trace}:DEF {parameter}',
    parameterDefineQuery: ':CALC{channel}:PAR{trace}:DEF?',
    parameterSelect: ':CALC{channel}:PAR{trace}:SEL',
    dataQuery: ':CALC{channel}:DATA? SDATA',
    frequencyAxisQuery: ':CALC{channel}:X?',
  },
};
