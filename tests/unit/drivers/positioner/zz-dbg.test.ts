import { it } from 'vitest';
import { runPositionerJob } from '../../../support/zz-job.ts';

it('x', async () => {
  const o = await runPositionerJob({
    quirks: { bannerLost: true, lostOks: 0.02, noise: 0.01 },
    seed: 13,
    homing: 'none',
    moves: [
      { azimuth: -19, trouble: { kind: 'stop', afterMs: 1043 } },
      { azimuth: 0, trouble: { kind: 'hold', afterMs: 3 } },
      { azimuth: 0, trouble: { kind: 'restart', afterMs: 0 } },
      { azimuth: 0, trouble: { kind: 'none', afterMs: 0 } },
    ],
  });
  console.log(
    o.failures,
    o.errors.map((e) => e.message),
  );
});
