import { describe, expect, it } from 'vitest';
import type { Measure, SParameterName } from '../../../../mocks/analyzer/measurement.ts';
import { bench } from './visitor.ts';

/** Every point of a parameter is its number: 11, 21, 12 or 22. */
const measure: Measure = ({ parameters, frequenciesHz }) =>
  new Map(
    parameters.map((name): [SParameterName, Float64Array] => [
      name,
      new Float64Array(2 * frequenciesHz.length).fill(Number(name.slice(1))),
    ]),
  );

const first = (answer: string): number => Number(answer.split(',')[0]);

describe('the tree of named measurements', () => {
  const tree = { measure, commandTree: 'named-measurement' } as const;

  it('reads the one selected by its name', async () => {
    const { visitor } = await bench(tree);
    await visitor.ask(`INIT:CONT OFF;:SWE:POIN 3;:CALC:PAR:DEL:ALL`);
    await visitor.ask(`CALC:PAR:DEF 'A',S21;DEF:EXT "B","S12"`);
    await visitor.ask(`DISP:WIND:TRAC1:FEED 'A';:DISP:WIND:TRAC2:FEED 'B'`);
    await visitor.ask('INIT;*OPC?', 1000);
    expect((await visitor.ask('CALC:PAR:CAT?')).trim()).toBe('"A,S21,B,S12"');
    await visitor.ask(`CALC:PAR:SEL 'B'`);
    expect((await visitor.ask('CALC:PAR:SEL?')).trim()).toBe('"B"');
    expect(first(await visitor.ask('CALC:DATA? SDATA'))).toBe(12);
    await visitor.ask(`CALC:PAR:SEL 'A'`);
    expect(first(await visitor.ask('CALC:DATA? SDATA'))).toBe(21);
    expect(await visitor.ask('SYST:ERR?')).toMatch(/^\+?0,/);
  });

  it.each([
    [`CALC:PAR:DEF 'FIRST',S21`, -221],
    [`CALC:PAR:DEF FREE,S21`, -104],
    [`CALC:PAR:DEF 'FREE',S31`, -224],
    [`CALC:PAR:SEL 'NONE'`, -224],
    [`CALC:PAR:DEL 'NONE'`, -224],
    [`CALC:PAR:DEF 'B',S21;:DISP:WIND:TRAC1:FEED 'B'`, -221],
    ['CALC:PAR1:DEF S21', -114],
    ['CALC:PAR:COUN 2', -113],
    ['CALC:MEAS1:DEF "S21"', -113],
  ])('refuses %s', async (message, number) => {
    const { visitor } = await bench(tree);
    await visitor.ask(message);
    expect(first(await visitor.ask('SYST:ERR?'))).toBe(number);
  });

  it('sweeps only what is shown, and selects nothing by itself', async () => {
    const { visitor } = await bench(tree);
    await visitor.ask(`INIT:CONT OFF;:SWE:POIN 3;:CALC:PAR:DEL:ALL;:CALC:PAR:DEF 'A',S21`);
    await visitor.ask('INIT;*OPC?', 1000);
    await visitor.ask('CALC:PAR:CAT?;:CALC:DATA? SDATA');
    expect(first(await visitor.ask('SYST:ERR?'))).toBe(-221);
    await visitor.ask(`CALC:PAR:SEL 'A';:CALC:PAR:CAT?;:CALC:DATA? SDATA`);
    expect(first(await visitor.ask('SYST:ERR?'))).toBe(-230);
  });
});

describe('the tree of traces by number', () => {
  const tree = { measure, commandTree: 'selected-trace' } as const;

  it('reads the trace whose number is in the question', async () => {
    const { visitor } = await bench(tree);
    await visitor.ask(`SWE:MODE HOLD;:SWE:POIN 3;:CALC:MEAS:DEL:ALL`);
    await visitor.ask(`CALC:MEAS7:DEF 'S22';:CALC:MEAS3:DEF "S12"`);
    expect((await visitor.ask('CALC:MEAS:CAT?')).trim()).toBe('"7,3"');
    await visitor.ask('SWE:MODE SING;*OPC?', 1000);
    expect((await visitor.ask('SWE:MODE?')).trim()).toBe('HOLD');
    expect(first(await visitor.ask('CALC:MEAS7:DATA:SDAT?'))).toBe(22);
    expect(first(await visitor.ask('CALC:MEAS3:DATA:SDAT?'))).toBe(12);
    expect((await visitor.ask('CALC:MEAS3:DEF?')).trim()).toBe('"S12"');
    expect((await visitor.ask('CALC:MEAS3:X?')).split(',')).toHaveLength(3);
  });

  it.each([
    ['CALC:MEAS2:DATA:SDAT?;*OPC?', -114],
    [`CALC:MEAS99:DEF 'S21'`, -114],
    ['CALC:MEAS1:DEF S21', -104],
    ['CALC:DATA? SDATA;*OPC?', -113],
    ['INIT', -113],
    ['CALC:PAR:SEL', -113],
  ])('refuses %s', async (message, number) => {
    const { visitor } = await bench(tree);
    await visitor.ask(message);
    expect(first(await visitor.ask('SYST:ERR?'))).toBe(number);
  });
});
