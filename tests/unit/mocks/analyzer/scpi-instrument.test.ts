import { describe, expect, it } from 'vitest';
import { bench, type Visitor } from './visitor.ts';

const idn = 'NIGHTCUT,BENCH-2PORT,SIM-0001,1.0\r\n';
const noError = '0,"No error"\r\n';

async function nextError(visitor: Visitor): Promise<number> {
  return Number.parseInt(await visitor.ask('SYST:ERR?'), 10);
}

/** All errors waiting, oldest first. */
async function errors(visitor: Visitor): Promise<number[]> {
  const found: number[] = [];
  for (let number = await nextError(visitor); number !== 0; number = await nextError(visitor))
    found.push(number);
  return found;
}

// Behaviour below was seen on the wire of a rig analyzer built on an open-source SCPI parser library, or is
// of the norms IEEE 488.2 and SCPI-1999; each block says which.
describe('lines (rig)', () => {
  it('takes LF, CR LF and CR as ends and answers with CR LF', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('*IDN?')).toBe(idn);
    expect(await visitor.ask('*IDN?\r')).toBe(idn);
    await visitor.send('*IDN?\r');
    expect(await visitor.waitMs(10)).toBe(idn);
    expect(await visitor.ask('')).toBe('');
    expect(await visitor.ask(';;')).toBe('');
    expect(await visitor.ask('SYST:ERR?')).toBe(noError);
  });

  it('ignores white space around a message and case', async () => {
    const { visitor } = await bench();
    for (const text of ['  *IDN?  ', '*IDN?\t', '*idn?', '*IDN? ;'])
      expect(await visitor.ask(text)).toBe(idn);
  });

  it('waits for the rest of a line and answers two lines of one piece in order', async () => {
    const { visitor } = await bench();
    await visitor.send('*ID');
    expect(await visitor.waitMs(1000)).toBe('');
    expect(await visitor.ask('N?')).toBe(idn);
    expect(await visitor.ask('*IDN?\nSWE:POIN?')).toBe(`${idn}201\r\n`);
  });

  it('skips control characters with −101', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('\0*IDN?')).toBe(idn);
    expect(await errors(visitor)).toEqual([-101]);
  });

  it('loses a line longer than its buffer: −363, and −101 for the tail', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask(`FREQ:STAR ${'0'.repeat(5000)}`)).toBe('');
    expect(await visitor.ask('*IDN?')).toBe(idn);
    expect(await errors(visitor)).toEqual([-363, -101]);
  });

  it('can end its lines otherwise and greet', async () => {
    const { visitor } = await bench({ lineEnd: '\n', greeting: 'ready' });
    expect(await visitor.waitMs(1)).toBe('ready\n');
    expect(await visitor.ask('*IDN?')).toBe(idn.replace('\r', ''));
  });
});

describe('headers (rig and SCPI-1999)', () => {
  it('takes long and short forms, nothing between, and suffix 1 or another channel', async () => {
    const { visitor } = await bench();
    for (const text of [
      'SENS1:FREQ:STAR?',
      'FREQuency:STARt?',
      ':freq:star?',
      'SENSe:FREQ:STARt?',
      'sens2:freq:star?',
    ]) {
      expect(await visitor.ask(text)).toBe('300000\r\n');
    }
    expect(await visitor.ask('FREQU:STAR?')).toBe('');
    expect(await visitor.ask('SYST:ERR?')).toBe('-113,"Undefined header;FREQU:STAR?"\r\n');
    expect(await visitor.ask('SYST:ERR?')).toBe(noError);
  });

  it('carries the path along in a compound message, and back to the root with a colon', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('FREQ:STAR 1e9;STOP 2E9;:SWE:POIN 5')).toBe('');
    expect(await visitor.ask('FREQ:STAR?;STOP?;:SWE:POIN?')).toBe('1000000000;2000000000;5\r\n');
    expect(await visitor.ask('FREQ:STAR?;SWE:POIN?')).toBe('1000000000\r\n');
    expect(await visitor.ask('SYST:ERR?')).toBe('-113,"Undefined header;SWE:POIN?"\r\n');
    expect(await visitor.ask('FREQ:STAR?;*ESE?;STOP?')).toBe('1000000000;0;2000000000\r\n');
  });

  it('leaves a refused unit out of the answer', async () => {
    const { visitor } = await bench();
    await visitor.ask('*CLS;FREQ:STAR 1e9;STOP 2e9');
    expect(await visitor.ask('FREQ:STAR?;NOPE?;STOP?')).toBe('1000000000;2000000000\r\n');
    expect(await visitor.ask('*ESR?')).toBe('32\r\n');
    expect(await errors(visitor)).toEqual([-113]);
  });

  it.each([
    ['OUTP3:STAT:X 1', -113],
    ['ABOR2', -114],
    ['CALC:PAR5:DEF S21', -114],
    ['FREQ:STAR=1', -101],
    ['1FREQ', -101],
    ['::FREQ:STAR?', -102],
    ['FREQ:STAR,1', -103],
    ['ABCDEFGHIJKLMNO 1', -112],
    ["SYST:ERR? 'open", -151],
  ])('refuses %s with %d', async (text, number) => {
    const { visitor } = await bench();
    expect(await visitor.ask(text)).toBe('');
    expect(await errors(visitor)).toEqual([number]);
  });
});

describe('parameters (rig and SCPI-1999)', () => {
  it('understands units; M is mega before HZ and milli before S', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('FREQ:STAR 1.5 GHZ;STAR?')).toBe('1500000000\r\n');
    expect(await visitor.ask('FREQ:STAR 900 MHz;STAR?')).toBe('900000000\r\n');
    expect(await visitor.ask('SWE:DWEL 5 MS;DWEL?')).toBe('0.005\r\n');
    expect(await visitor.ask('SOUR:POW -12.5 DBM;POW?')).toBe('-12.5\r\n');
    expect(await visitor.ask('SWE:POIN #H65;POIN?')).toBe('101\r\n');
  });

  it('sets and tells its limits by name', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('FREQ:STAR? MAX')).toBe('9000000000\r\n');
    await visitor.ask('FREQ:STAR 1e9');
    expect(await visitor.ask('FREQ:STAR MIN;STAR?')).toBe('300000\r\n');
  });

  it.each([
    ['FREQ:STAR 99GHZ', -222],
    ['SOUR:POW 11', -222],
    ['FREQ:STAR 1V', -131],
    ['SWE:POIN 11 HZ', -138],
    ['FREQ:STAR', -109],
    ['FREQ:STAR 1,,2', -109],
    ['FREQ:STAR 1E9,2E9', -108],
    ['*CLS 1', -108],
    ['FREQ:STAR 1..5', -121],
    ['FREQ:STAR slow', -104],
    ['OUTP maybe', -224],
    ['FORM REAL,16', -224],
    ['CALC:PAR:DEF S31', -224],
    ['FREQ:STAR? NOW', -224],
  ])('refuses %s with %d and stays as it was', async (text, number) => {
    const { visitor } = await bench();
    const before = await visitor.ask('FREQ:STAR?;STOP?;:SWE:POIN?;:OUTP?;:SOUR:POW?;:FORM?;:CALC:PAR:DEF?');
    expect(await visitor.ask(text)).toBe('');
    expect(await errors(visitor)).toEqual([number]);
    expect(await visitor.ask('FREQ:STAR?;STOP?;:SWE:POIN?;:OUTP?;:SOUR:POW?;:FORM?;:CALC:PAR:DEF?')).toBe(
      before,
    );
  });

  it('coerces the IF bandwidth to the steps 1 1.5 2 3 5 7 of each decade, upwards', async () => {
    const { visitor } = await bench();
    const pairs = [
      [1234, 1500],
      [1000, 1000],
      [1001, 1500],
      [200, 200],
      [45, 50],
      [8, 10],
      [71_000, 100_000],
    ];
    for (const [wish, got] of pairs) expect(await visitor.ask(`BAND ${wish};BAND?`)).toBe(`${got}\r\n`);
    expect(await visitor.ask('SENS:BWID:RES 300;:BAND?')).toBe('300\r\n');
  });

  it('moves stop with start and shrinks a span at the edge', async () => {
    const { visitor } = await bench();
    await visitor.ask('FREQ:STAR 1e9;STOP 2e9');
    expect(await visitor.ask('FREQ:STAR 3e9;STOP?')).toBe('3000000000\r\n');
    expect(await visitor.ask('FREQ:STOP 2e9;STAR?')).toBe('2000000000\r\n');
    expect(await visitor.ask('FREQ:CENT 8.5e9;SPAN 4e9;SPAN?;STAR?;STOP?')).toBe(
      '1000000000;8000000000;9000000000\r\n',
    );
  });
});

describe('errors and status (rig and IEEE 488.2)', () => {
  it('keeps fifteen of twenty errors and then −350', async () => {
    const { visitor } = await bench();
    for (let i = 0; i < 20; i++) await visitor.send(`NOPE${i}\n`);
    expect(await visitor.ask('SYST:ERR:COUN?')).toBe('16\r\n');
    for (let i = 0; i < 15; i++) {
      expect(await visitor.ask('SYST:ERR?')).toBe(`-113,"Undefined header;NOPE${i}"\r\n`);
    }
    expect(await visitor.ask('SYST:ERR:NEXT?')).toBe('-350,"Queue overflow"\r\n');
    expect(await visitor.ask('SYST:ERR?')).toBe(noError);
  });

  it('shows errors in the status byte, masks them in, and clears on *CLS', async () => {
    const { visitor } = await bench();
    await visitor.ask('*CLS');
    expect(await visitor.ask('*STB?')).toBe('0\r\n');
    await visitor.ask('NOPE');
    expect(await visitor.ask('*STB?')).toBe('4\r\n');
    expect(await visitor.ask('*ESR?')).toBe('32\r\n');
    await visitor.ask('*ESE 60;*SRE 32');
    await visitor.ask('NOPE');
    expect(await visitor.ask('*STB?')).toBe('100\r\n');
    await visitor.ask('*CLS');
    expect(await visitor.ask('*STB?;*ESR?;*ESE?;*SRE?')).toBe('0;0;60;32\r\n');
  });

  it('tells once that power has come, and once per execution and device error', async () => {
    const { visitor, instrument } = await bench();
    expect(await visitor.ask('*ESR?')).toBe('128\r\n');
    expect(await visitor.ask('*ESR?')).toBe('0\r\n');
    await visitor.ask('FREQ:STAR 99GHZ');
    expect(await visitor.ask('*ESR?')).toBe('16\r\n');
    instrument.raiseError(503, 'source unlevelled');
    expect(await visitor.ask('*ESR?')).toBe('8\r\n');
    expect(await errors(visitor)).toEqual([-222, 503]);
  });
});

describe('sweeps in time (rig)', () => {
  it('takes points × (1/IF bandwidth + 20 µs) and tells so', async () => {
    const { visitor, clock } = await bench();
    await visitor.ask('FREQ:STAR 2e9;STOP 3e9;:SWE:POIN 201;:BAND 1000;:INIT:CONT OFF');
    expect(await visitor.ask('SWE:TIME?')).toBe('0.20502\r\n');
    expect(await visitor.ask('BAND 200;SWE:TIME?')).toBe('1.00902\r\n');
    const startMs = clock.monotonicMs();
    let answeredMs = 0;
    visitor.link.received$.subscribe(() => {
      answeredMs = clock.monotonicMs();
    });
    await visitor.send('INIT;*OPC?\n');
    expect(await visitor.waitMs(2000)).toBe('1\r\n');
    expect(answeredMs - startMs).toBeCloseTo(1009.02, 6);
  });

  it('refuses INIT in continuous mode and while sweeping; ABOR ends it', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('INIT')).toBe('');
    expect(await errors(visitor)).toEqual([-213]);
    expect(await visitor.ask('INIT:CONT OFF;CONT?')).toBe('0\r\n');
    await visitor.ask('BAND 100;:INIT');
    expect(await visitor.ask('STAT:OPER:COND?')).toBe('16\r\n');
    await visitor.ask('INIT');
    expect(await errors(visitor)).toEqual([-213]);
    expect(await visitor.ask('ABOR;:STAT:OPER:COND?')).toBe('0\r\n');
    expect(await visitor.ask('CALC:DATA? SDATA')).toBe('');
    expect(await errors(visitor)).toEqual([-230]);
  });

  it('is deaf behind *OPC? and *WAI, and answers in order afterwards', async () => {
    const { visitor } = await bench();
    await visitor.ask('SWE:POIN 201;:BAND 200;:INIT:CONT OFF');
    await visitor.send('INIT;*OPC?\n*IDN?\n');
    expect(await visitor.waitMs(1000)).toBe('');
    expect(await visitor.waitMs(20)).toBe(`1\r\n${idn}`);
    await visitor.send('INIT;*OPC?\n');
    await visitor.waitMs(100);
    await visitor.send('*IDN?\n');
    expect(await visitor.waitMs(800)).toBe('');
    expect(await visitor.waitMs(200)).toBe(`1\r\n${idn}`);
    await visitor.send('INIT;*WAI;*IDN?\n');
    expect(await visitor.waitMs(1000)).toBe('');
    expect(await visitor.waitMs(20)).toBe(idn);
  });

  it('raises bit 0 after *OPC only when the sweep is over, and stays usable', async () => {
    const { visitor } = await bench();
    await visitor.ask('*CLS;:SWE:POIN 201;:BAND 200;:INIT:CONT OFF;:INIT;*OPC');
    expect(await visitor.ask('*ESR?')).toBe('0\r\n');
    await visitor.waitMs(900);
    expect(await visitor.ask('*ESR?')).toBe('0\r\n');
    await visitor.waitMs(100);
    expect(await visitor.ask('*ESR?')).toBe('1\r\n');
    expect(await visitor.ask('*ESR?')).toBe('0\r\n');
  });

  it('forgets *OPC on *CLS and *RST', async () => {
    for (const forget of ['*CLS', '*RST']) {
      const { visitor } = await bench();
      await visitor.ask(`*CLS;:SWE:POIN 201;:INIT:CONT OFF;:INIT;*OPC;${forget}`);
      await visitor.waitMs(1000);
      expect(await visitor.ask('*ESR?')).toBe('0\r\n');
    }
  });

  it('needs a pass for each driven port and tells so', async () => {
    const { visitor, clock } = await bench();
    await visitor.ask('INIT:CONT OFF;:BAND 1000;:SWE:POIN 100;:CALC:PAR:COUN 2;:CALC:PAR2:DEF S21');
    expect(await visitor.ask('SWE:TIME?')).toBe('0.102\r\n');
    expect(await visitor.ask('CALC:PAR2:DEF S22;:SWE:TIME?')).toBe('0.204\r\n');
    const startMs = clock.monotonicMs();
    let endMs = 0;
    visitor.link.received$.subscribe(() => {
      endMs = clock.monotonicMs();
    });
    await visitor.ask('INIT;*OPC?', 1000);
    expect(endMs - startMs).toBeCloseTo(204, 6);
  });

  it('answers *OPC? at once when nothing single runs', async () => {
    const { visitor } = await bench();
    expect(await visitor.ask('*OPC?')).toBe('1\r\n');
    expect(await visitor.ask('INIT:CONT OFF;*OPC?')).toBe('1\r\n');
  });

  it('waits for the trigger it was told to wait for', async () => {
    const { visitor } = await bench();
    await visitor.ask('INIT:CONT OFF;:TRIG:SOUR BUS;:SWE:POIN 11');
    await visitor.ask('*TRG');
    expect(await errors(visitor)).toEqual([-211]);
    await visitor.ask('INIT');
    expect(await visitor.ask('STAT:OPER:COND?', 5000)).toBe('32\r\n');
    await visitor.ask('*TRG', 100);
    expect(await visitor.ask('STAT:OPER:COND?')).toBe('0\r\n');
    expect(await visitor.ask('CALC:DATA? SDATA')).not.toBe('');
  });

  it('measures every point at its own time, one pass per driven port, averages as told', async () => {
    const { visitor, passes, clock } = await bench();
    await visitor.ask('INIT:CONT OFF;:BAND 1000;:SWE:POIN 11;:AVER ON;:AVER:COUN 4;MODE POIN');
    await visitor.ask(
      'CALC:PAR:COUN 3;:CALC:PAR1:DEF S11;:CALC:PAR2:DEF S21;:CALC:PAR3:DEF S12;:SOUR:POW -10',
    );
    const startMs = clock.monotonicMs();
    await visitor.ask('INIT;*OPC?', 1000);
    expect(passes.map(({ drivenPort, parameters }) => [drivenPort, ...parameters])).toEqual([
      [1, 'S11', 'S21'],
      [2, 'S12'],
    ]);
    const [first, second] = passes;
    expect(first).toMatchObject({
      averages: 4,
      ifBandwidthHz: 1000,
      powerDbm: -10,
      sourceOn: true,
      corrected: true,
    });
    // 4 × 1.02 ms a point, in its middle.
    expect(first!.pointMs(0) - startMs).toBeCloseTo(2.04, 6);
    expect(first!.pointMs(10) - startMs).toBeCloseTo(10.5 * 4.08, 6);
    expect(second!.pointMs(0) - startMs).toBeCloseTo(11.5 * 4.08, 6);
    await visitor.ask('AVER:MODE SWE;:INIT;*OPC?', 1000);
    expect(passes.length).toBe(2 + 8);
    expect(passes.at(-1)!.averages).toBe(1);
    expect(passes.at(-1)!.frequenciesHz).toBe(first!.frequenciesHz);
  });

  it('averages whole sweeps of the world’s own noise', async () => {
    let level = 0;
    const { visitor } = await bench({
      measure: (pass) => {
        level += 1;
        return new Map(
          pass.parameters.map((name) => [name, new Float64Array(2 * pass.frequenciesHz.length).fill(level)]),
        );
      },
    });
    await visitor.ask('INIT:CONT OFF;:SWE:POIN 1;:AVER ON;:AVER:COUN 3;:INIT;*OPC?', 1000);
    // Sweeps of 1, 2 and 3: mean 2.
    expect(await visitor.ask('CALC:DATA? SDATA')).toBe('+2.00000000000E+00,+2.00000000000E+00\r\n');
  });

  it('sweeps on by itself in continuous mode without a timer', async () => {
    const { visitor, passes } = await bench();
    await visitor.ask('SWE:POIN 101;:BAND 1000');
    expect(await visitor.ask('CALC:DATA? SDATA')).toBe('');
    expect(await errors(visitor)).toEqual([-230]);
    await visitor.waitMs(1000);
    expect(passes.length).toBe(0);
    expect(await visitor.ask('CALC:DATA? SDATA')).not.toBe('');
    const before = passes.at(-1)!.pointMs(0);
    await visitor.waitMs(500);
    await visitor.ask('CALC:DATA? SDATA');
    const periods = (passes.at(-1)!.pointMs(0) - before) / (101 * 1.02);
    expect(periods).toBeGreaterThanOrEqual(4);
    expect(Math.abs(periods - Math.round(periods))).toBeLessThan(1e-6);
  });
});

describe('traces and data (rig)', () => {
  async function swept(parameters = ['S21', 'S11']) {
    const parts = await bench();
    const { visitor } = parts;
    await visitor.ask('INIT:CONT OFF;:FREQ:STAR 2e9;STOP 3e9;:SWE:POIN 3');
    await visitor.ask(`CALC:PAR:COUN ${parameters.length}`);
    for (const [i, name] of parameters.entries()) await visitor.ask(`CALC:PAR${i + 1}:DEF ${name}`);
    await visitor.ask('INIT;*OPC?', 100);
    return parts;
  }

  it('reads the selected trace', async () => {
    const { visitor } = await swept();
    expect(await visitor.ask('CALC:PAR:COUN?;:CALC:PAR1:DEF?;:CALC:PAR2:DEF?')).toBe('2;S21;S11\r\n');
    expect(await visitor.ask('CALC:DATA? SDATA')).toBe(
      '+0.00000000000E+00,+2.10000000000E+01,+1.00000000000E+00,+2.10000000000E+01,+2.00000000000E+00,+2.10000000000E+01\r\n',
    );
    await visitor.ask('CALC:PAR2:SEL');
    expect((await visitor.ask('CALC:DATA:SDAT?')).split(',')[1]).toBe('+1.10000000000E+01');
    expect((await visitor.ask('CALC1:SEL:DATA:SDAT?')).split(',')[1]).toBe('+1.10000000000E+01');
  });

  it('has no data after a change of the stimulus until it has swept, nor for a new parameter', async () => {
    const { visitor } = await swept();
    for (const change of [
      'FREQ:STAR 2.1e9',
      'SWE:POIN 4',
      'BAND 3000',
      'SOUR:POW -5',
      'AVER ON',
      'CORR OFF',
      'CALC:PAR1:DEF S22',
    ]) {
      expect(await visitor.ask('CALC:DATA? SDATA')).not.toBe('');
      await visitor.ask(change);
      expect(await visitor.ask('CALC:DATA? SDATA')).toBe('');
      expect(await errors(visitor)).toEqual([-230]);
      await visitor.ask('INIT');
      await visitor.waitMs(100);
    }
    expect(await visitor.ask('FORM REAL,32;:CALC:DATA? SDATA')).not.toBe('');
  });

  it('keeps the old data while the next sweep runs', async () => {
    const { visitor } = await swept();
    await visitor.ask('BAND 10');
    await visitor.ask('INIT;*OPC?', 1000);
    const old = await visitor.ask('CALC:DATA? SDATA');
    expect(old).not.toBe('');
    await visitor.ask('INIT');
    expect(await visitor.ask('STAT:OPER:COND?;:CALC:DATA? SDATA')).toBe(`16;${old}`);
  });

  it('tells the frequency axis', async () => {
    const { visitor } = await swept();
    const axis = '+2.00000000000E+09,+2.50000000000E+09,+3.00000000000E+09\r\n';
    expect(await visitor.ask('CALC:X?')).toBe(axis);
    expect(await visitor.ask('SENS:FREQ:DATA?')).toBe(axis);
    expect(await visitor.ask('SWE:TYPE LOG;:FREQ:DATA?')).toBe(
      `+2.00000000000E+09,${(Math.sqrt(6) * 1e9).toExponential(11).replace('e+9', 'E+09').replace(/^/, '+')},+3.00000000000E+09\r\n`,
    );
  });

  it('sends blocks: big-endian unless swapped, 64 or 32 bits, ended like a line', async () => {
    const { visitor } = await swept(['S21']);
    const bytes = async (): Promise<Uint8Array> =>
      Uint8Array.from(await visitor.ask('CALC:DATA? SDATA'), (c) => c.charCodeAt(0));
    expect(await visitor.ask('FORM REAL,64;FORM?')).toBe('REAL,64\r\n');
    const big = await bytes();
    expect(big.length).toBe(4 + 48 + 2);
    expect(String.fromCharCode(...big.slice(0, 4), ...big.slice(-2))).toBe('#248\r\n');
    const view = new DataView(big.buffer, 4, 48);
    expect([0, 1, 2, 3, 4, 5].map((i) => view.getFloat64(8 * i))).toEqual([0, 21, 1, 21, 2, 21]);
    expect(await visitor.ask('FORM:BORD SWAP;BORD?')).toBe('SWAP\r\n');
    const little = await bytes();
    expect(new DataView(little.buffer, 4, 48).getFloat64(8, true)).toBe(21);
    await visitor.ask('FORM REAL,32');
    const short = await bytes();
    expect(String.fromCharCode(...short.slice(0, 4))).toBe('#224');
    expect(new DataView(short.buffer, 4, 24).getFloat32(4, true)).toBe(21);
    expect(await visitor.ask('FORM REAL;FORM?')).toBe('REAL,64\r\n');
    expect(await visitor.ask('FORM ASC;FORM?')).toBe('ASC,0\r\n');
  });

  it('joins a block with other answers', async () => {
    const { visitor } = await swept(['S21']);
    await visitor.ask('FORM REAL,64');
    const text = await visitor.ask('SWE:POIN?;:CALC:DATA? SDATA;:OUTP?');
    expect(text.slice(0, 6)).toBe('3;#248');
    expect(text.slice(-4)).toBe(';1\r\n');
    expect(text.length).toBe(2 + 4 + 48 + 4);
  });

  it('formats: level, phase, standing wave ratio, both parts in the Smith chart', async () => {
    const { visitor } = await bench({
      // 0.3 + 0.4j: magnitude 0.5, −6.0206 dB, 53.1301°, VSWR 3 (definitions).
      measure: (pass) => new Map(pass.parameters.map((name) => [name, Float64Array.of(0.3, 0.4)])),
    });
    await visitor.ask('INIT:CONT OFF;:SWE:POIN 1;:INIT;*OPC?', 100);
    const wanted = { MLOG: -6.0206, MLIN: 0.5, PHAS: 53.1301, SWR: 3, REAL: 0.3, IMAG: 0.4 };
    for (const [word, value] of Object.entries(wanted)) {
      expect(Number(await visitor.ask(`CALC:FORM ${word};:CALC:DATA? FDATA`))).toBeCloseTo(value, 4);
    }
    expect(await visitor.ask('CALC:FORM SMIT;FORM?;:CALC:DATA? FDAT')).toMatch(/^SMIT;\+3.*,\+4/);
  });

  it('writes 9.91E37 for what is no number', async () => {
    const { visitor, instrument } = await bench();
    instrument.faults = {
      onTraces: (traces) => {
        for (const trace of traces.values()) trace.fill(Number.NaN);
      },
    };
    await visitor.ask('INIT:CONT OFF;:SWE:POIN 1;:INIT;*OPC?', 100);
    expect(await visitor.ask('CALC:DATA? SDATA')).toBe('+9.91000000000E+37,+9.91000000000E+37\r\n');
  });

  it('has no data after a reset, even when nothing else has changed', async () => {
    const { visitor } = await bench();
    await visitor.ask('INIT:CONT OFF;:INIT;*OPC?', 1000);
    expect(await visitor.ask('CALC:DATA? SDATA')).not.toBe('');
    expect(await visitor.ask('*RST;:CALC:DATA? SDATA')).toBe('');
    expect(await errors(visitor)).toEqual([-230]);
  });

  it('goes back to its preset on *RST and SYST:PRES: continuous, 201 points, text, output on', async () => {
    for (const reset of ['*RST', 'SYST:PRES']) {
      const { visitor } = await swept();
      await visitor.ask('FORM REAL,64;:OUTP OFF');
      expect(await visitor.ask(`${reset};:SWE:POIN?;:INIT:CONT?;:OUTP?;:FORM?;:CALC:PAR:COUN?`)).toBe(
        '201;1;1;ASC,0;1\r\n',
      );
    }
  });
});

describe('visitors (rig)', () => {
  it('serves one at a time: the second connects and hears nothing until the first has gone', async () => {
    const { visitor, visit } = await bench();
    const second = await visit();
    expect(await second.ask('*IDN?', 5000)).toBe('');
    expect(await visitor.ask('*IDN?')).toBe(idn);
    await visitor.link.close();
    expect(await second.waitMs(10)).toBe(idn);
  });

  it('can serve several', async () => {
    const { visitor, visit } = await bench({ sessions: 'several' });
    const second = await visit();
    await visitor.send('*ID');
    expect(await second.ask('SWE:POIN 7;POIN?')).toBe('7\r\n');
    expect(await visitor.ask('N?;:SWE:POIN?')).toBe(`${idn.slice(0, -2)};7\r\n`);
  });

  it('keeps settings, errors and the remains of a half line for the next visitor', async () => {
    const { visitor, visit } = await bench();
    await visitor.ask('SWE:POIN 2001;:FREQ:STAR 2e9;:NOPE');
    await visitor.send('FREQ:STAR 1');
    await visitor.waitMs(1);
    await visitor.link.close();
    await visitor.waitMs(1);
    const next = await visit();
    expect(await next.ask('FREQ:STAR?')).toBe('2000000000\r\n');
    expect(await errors(next)).toEqual([-113, -101]);
    expect(await next.ask('SWE:POIN?')).toBe('2001\r\n');
  });

  it('loses everything but the news of it in a power cycle, and refuses while it boots', async () => {
    const { visitor, visit, instrument, clock } = await bench();
    await visitor.ask('SWE:POIN 7;:OUTP OFF;:INIT:CONT OFF;:BAND 10;:INIT;:NOPE;*ESE 60;*ESR?');
    await visitor.send('*OPC?\n');
    await visitor.waitMs(1);
    await clock.run(instrument.powerCycle(30_000));
    expect(await visitor.waitMs(10)).toBe('');
    expect(visitor.link.isOpen).toBe(false);
    const early = await visit();
    await early.waitMs(10);
    expect(early.link.isOpen).toBe(false);
    await early.waitMs(30_000);
    const later = await visit();
    expect(await later.ask('*ESR?;*ESE?;:SWE:POIN?;:OUTP?;:INIT:CONT?;:SYST:ERR?')).toBe(
      `128;0;201;1;1;${noError}`,
    );
  });
});

describe('faults', () => {
  it('swallows messages, alters, loses and holds back answers', async () => {
    const { visitor, instrument } = await bench();
    instrument.faults = { onMessage: (message) => (message === '*IDN?' ? 'lose' : 'run') };
    expect(await visitor.ask('*IDN?', 60_000)).toBe('');
    expect(await visitor.ask('*ESE?')).toBe('0\r\n');
    instrument.faults = { onAnswer: (answer) => answer.slice(0, 3) };
    expect(await visitor.ask('*IDN?')).toBe('NIG');
    instrument.faults = { onAnswer: () => undefined };
    expect(await visitor.ask('*IDN?', 60_000)).toBe('');
    instrument.faults = { delayAnswerMs: (message) => (message === '*IDN?' ? 3000 : 0) };
    await visitor.send('*IDN?\n*ESE?\n');
    expect(await visitor.waitMs(2999)).toBe('');
    expect(await visitor.waitMs(2)).toBe(`${idn}0\r\n`);
  });

  it('can take longer than it said, or for ever', async () => {
    const { visitor, instrument } = await bench();
    await visitor.ask('INIT:CONT OFF;:SWE:POIN 10;:BAND 1000');
    instrument.faults = { stretchSweepMs: () => 500 };
    expect(await visitor.ask('INIT;*OPC?', 500)).toBe('');
    expect(await visitor.waitMs(20)).toBe('1\r\n');
    instrument.faults = { stretchSweepMs: () => Number.POSITIVE_INFINITY };
    expect(await visitor.ask('INIT', 3_600_000)).toBe('');
    expect(await visitor.ask('STAT:OPER:COND?')).toBe('16\r\n');
    expect(await visitor.ask('ABOR;:STAT:OPER:COND?')).toBe('0\r\n');
  });

  it('has no calibration to switch on when it has none', async () => {
    const { visitor, passes } = await bench({ calibrated: false });
    expect(await visitor.ask('CORR?')).toBe('0\r\n');
    await visitor.ask('CORR ON');
    expect(await errors(visitor)).toEqual([-221]);
    await visitor.ask('INIT:CONT OFF;:OUTP OFF;:INIT;*OPC?', 1000);
    expect(passes[0]).toMatchObject({ corrected: false, sourceOn: false });
  });
});
