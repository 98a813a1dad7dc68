// What the numbers in `ALARM:N` and `error:N` mean for a rotary stage. Two firmwares of the family share the
// low numbers; the higher ones belong to the younger of them. Numbers that are not listed are shown as they are.

export interface AlarmMeaning {
  meaning: string;
  /** Whether the step counter still tells where the shaft is. In doubt: false. */
  positionKnown: boolean;
  /**
   * `reset`: the controller is mute until a soft reset, then unlock; `unlock`: unlocking is enough;
   * `home`: only a homing cycle makes the position true again; `inspect`: somebody has to look first.
   */
  wayOut: 'reset' | 'unlock' | 'home' | 'inspect';
}

const alarms: Readonly<Record<number, AlarmMeaning>> = {
  1: { meaning: 'a limit switch closed', positionKnown: false, wayOut: 'reset' },
  2: { meaning: "target beyond the controller's own travel", positionKnown: true, wayOut: 'reset' },
  3: { meaning: 'reset while moving: the motor may have run on', positionKnown: false, wayOut: 'home' },
  4: { meaning: 'probe in the wrong state', positionKnown: true, wayOut: 'unlock' },
  5: { meaning: 'probe made no contact', positionKnown: true, wayOut: 'unlock' },
  6: { meaning: 'homing was interrupted by a reset', positionKnown: false, wayOut: 'home' },
  7: { meaning: 'homing was interrupted by the door', positionKnown: false, wayOut: 'home' },
  8: { meaning: 'homing: the switch stays closed after backing off', positionKnown: false, wayOut: 'home' },
  9: { meaning: 'homing: the switch was not found', positionKnown: false, wayOut: 'home' },
  10: { meaning: 'emergency stop, or second homing switch missing', positionKnown: false, wayOut: 'inspect' },
  11: { meaning: 'the controller wants to be homed first', positionKnown: false, wayOut: 'home' },
  12: { meaning: 'a limit input is active', positionKnown: false, wayOut: 'inspect' },
  13: { meaning: 'probe protection is active', positionKnown: false, wayOut: 'inspect' },
  14: { meaning: 'spindle did not reach its speed', positionKnown: false, wayOut: 'inspect' },
  15: { meaning: 'homing: second switch of a double axis missing', positionKnown: false, wayOut: 'home' },
  16: { meaning: 'power-on self-test failed', positionKnown: false, wayOut: 'inspect' },
  17: { meaning: 'a motor driver reports a fault', positionKnown: false, wayOut: 'inspect' },
  18: { meaning: 'homing is not set up properly', positionKnown: false, wayOut: 'inspect' },
  19: { meaning: 'field bus fault', positionKnown: false, wayOut: 'inspect' },
  20: { meaning: 'input/output expander fault', positionKnown: false, wayOut: 'inspect' },
  21: { meaning: 'settings storage fault', positionKnown: false, wayOut: 'inspect' },
  22: { meaning: 'receive buffer overflow', positionKnown: false, wayOut: 'inspect' },
};

/** Never undefined: an alarm that is not listed says nothing good about the position. */
export function alarmMeaning(number: number): AlarmMeaning {
  return (
    alarms[number] ?? { meaning: `alarm ${number}, not listed`, positionKnown: false, wayOut: 'inspect' }
  );
}

const refusals: Readonly<Record<number, string>> = {
  1: 'a letter was expected',
  2: 'a number is missing or malformed',
  3: 'no such $ command',
  4: 'negative where it must be positive',
  5: 'homing is switched off in the controller',
  6: 'step pulse too short',
  7: 'settings could not be read, defaults are in force',
  8: 'only possible at rest',
  9: 'locked by an alarm or a jog',
  10: 'soft limits need homing',
  11: 'line too long',
  12: 'step rate too high',
  13: 'the door is open',
  14: 'stored line too long',
  15: "jog beyond the controller's travel",
  16: 'jog line malformed',
  17: 'laser mode needs a PWM output',
  18: 'the reset input is active',
  19: 'value must be positive',
  20: 'word not supported, or no such axis',
  21: 'two words of one modal group',
  22: 'no feed given',
  23: 'whole number expected',
  24: 'two commands claim the axis words',
  25: 'word repeated',
  26: 'axis words missing',
  27: 'line number invalid',
  28: 'value word missing',
  29: 'coordinate system not supported',
  30: 'machine coordinates need a straight move',
  31: 'axis words without use',
  32: 'arc without axis words in its plane',
  33: 'target impossible',
  34: 'arc radius impossible',
  35: 'arc offset missing',
  36: 'words left over',
  37: 'tool offset on the wrong axis',
  38: 'tool number too high',
  39: 'value out of range',
  40: 'tool change pending',
  41: 'spindle not running',
  42: 'threading needs another plane',
  43: 'feed above the maximum',
  44: 'speed out of range',
  45: 'a limit is engaged: only homing is possible',
  46: 'homing comes before unlocking',
  47: 'current tool unknown',
  48: 'value words conflict',
  49: 'self-test failed',
  50: 'emergency stop is active',
  51: 'a motor driver reports a fault',
  52: 'setting out of range',
  53: 'setting not available',
  54: 'retract below the start',
  55: 'double axes homed together',
  56: 'coordinate system locked',
  57: 'file mark unexpected',
  58: 'port not available',
  77: 'login needed',
  78: 'access denied',
  79: 'not possible during a critical event',
  84: 'file cannot be opened',
  86: 'port not usable',
  87: 'tool in spindle',
  88: 'no tool in spindle',
  253: 'defined by the build',
};

export function refusalMeaning(number: number): string {
  return refusals[number] ?? `error ${number}, not listed`;
}
