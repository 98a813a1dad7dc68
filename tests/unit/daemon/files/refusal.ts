// What a call refuses with, for the tests of written files.
import { expect } from 'vitest';
import { DaemonError } from '../../../../daemon/errors.ts';

/** The DaemonError a call throws; fails when it throws none or anything else. */
export function refusalOf(act: () => unknown): DaemonError {
  let thrown: unknown = 'nothing';
  try {
    act();
  } catch (error) {
    thrown = error;
  }
  expect(thrown).toBeInstanceOf(DaemonError);
  return thrown as DaemonError;
}
