// Commands that every instrument has: identity, status, errors, reset, waiting.
import type { Command } from './command-tree.ts';
import type { InstrumentState } from './instrument-state.ts';
import { integerOf } from './parameter-values.ts';
import { eventBits } from './status-registers.ts';

const byte = { min: 0, max: 255, def: 0 };
const word = { min: 0, max: 65_535, def: 0 };

export function commonCommands(state: InstrumentState): Command[] {
  const { errors, status } = state;
  return [
    { pattern: '*IDN', query: () => state.identity },
    { pattern: '*OPT', query: () => '0' },
    { pattern: '*TST', query: () => '0' },
    { pattern: '*RST', set: () => state.reset() },
    {
      pattern: '*CLS',
      set: () => {
        errors.clear();
        status.clear();
        state.forgetCompletion();
      },
    },
    { pattern: '*ESR', query: () => String(status.takeEvents()) },
    {
      pattern: '*ESE',
      takes: [1, 1],
      set: ({ parameters }) => {
        status.eventEnable = integerOf(parameters[0]!, byte);
      },
      query: () => String(status.eventEnable),
    },
    {
      pattern: '*SRE',
      takes: [1, 1],
      set: ({ parameters }) => {
        status.serviceEnable = integerOf(parameters[0]!, byte) & ~64;
      },
      query: () => String(status.serviceEnable),
    },
    { pattern: '*STB', query: () => String(status.statusByte(errors.count > 0)) },
    {
      pattern: '*OPC',
      set: () => state.announceCompletion(() => status.setEvent(eventBits.operationComplete)),
      query: async () => {
        await state.runner.whenDone();
        return '1';
      },
    },
    { pattern: '*WAI', set: () => state.runner.whenDone() },
    { pattern: '*TRG', set: () => state.trigger() },
    { pattern: 'SYSTem:ERRor[:NEXT]', query: () => errors.next() },
    { pattern: 'SYSTem:ERRor:COUNt', query: () => String(errors.count) },
    { pattern: 'SYSTem:VERSion', query: () => '1999.0' },
    { pattern: 'SYSTem:PRESet', set: () => state.reset() },
    ...operationCommands(state),
    { pattern: 'STATus:QUEStionable:CONDition', query: () => '0' },
    { pattern: 'STATus:QUEStionable[:EVENt]', query: () => '0' },
    {
      pattern: 'STATus:PRESet',
      set: () => {
        status.operationEnable = 0;
      },
    },
  ];
}

/** Bit 4: a sweep runs; bit 5: it waits for its trigger. */
function operationCommands({ status, runner }: InstrumentState): Command[] {
  return [
    {
      pattern: 'STATus:OPERation:CONDition',
      query: () => String((runner.isSweeping ? 16 : 0) | (runner.isArmed ? 32 : 0)),
    },
    { pattern: 'STATus:OPERation[:EVENt]', query: () => String(status.takeOperationEvents()) },
    {
      pattern: 'STATus:OPERation:ENABle',
      takes: [1, 1],
      set: ({ parameters }) => {
        status.operationEnable = integerOf(parameters[0]!, word);
      },
      query: () => String(status.operationEnable),
    },
  ];
}
