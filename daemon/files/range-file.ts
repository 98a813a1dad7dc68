// What stands on the site, as checked values with units. Loading and its errors are beside this file.
import type { ScanTableDialect } from '../../drivers/analyzer/scan-table/scan-table-dialect.ts';
import type { ScpiDialect } from '../../drivers/analyzer/scpi-templates.ts';
import type { AxisSetup } from '../../drivers/positioner/positioner.ts';

/** Where a device is reached. */
export type LinkAddress =
  | { kind: 'tcp'; host: string; port: number }
  | { kind: 'serial'; path: string; baud: number };

export interface RangeAxis extends AxisSetup {
  /** Pattern angle = sense × (position − boresightDeg), wrapped to (−180°, 180°]. */
  sense: 1 | -1;
  boresightDeg: number;
}

export interface ReferenceAntenna {
  name: string;
  /** `ieee`: without mismatch loss, corrected with the measured S11; `realized`: with it. */
  stated: 'ieee' | 'realized';
  /** Ascending in frequency; interpolated linearly in between, never beyond its ends. */
  table: readonly { frequencyHz: number; gainDbi: number }[];
  /** Standard uncertainty of the table where its owner knows it. */
  uncertaintyDb?: number;
  /** Largest dimension. */
  sizeM?: number;
}

/** How a motion controller is spoken to: status reports in angle brackets, or `M114` behind an `M400`. */
export type ControllerFamily = 'realtime-status' | 'position-report';

export interface RangeFile {
  /** Absolute path and text as read. */
  path: string;
  text: string;
  name: string;
  rangeLengthM: number;
  heights?: { rangeAntennaM: number; autM: number };
  /** From the line between the antennas to the nearest wall or other large surface along it. */
  nearestWallM?: number;
  /** From the rotation axis to the middle of the AUT. */
  autOffsetM?: number;
  /** All that cables, adapters and pads take between the analyzer's ports and both antennas, together. */
  cableLossDb?: number;
  /** Power density that nobody shall be exposed to, where the operator's own limit is to be used. */
  cautionLimitWM2?: number;
  analyzer: {
    link: LinkAddress;
    dialect: ScpiDialect | ScanTableDialect;
    /** The port the AUT is connected to; the range antenna is on the other of 1 and 2. */
    autPort: 1 | 2;
    trace: { format: 'real64' | 'real32' | 'ascii'; byteOrder: 'normal' | 'swapped' };
    /** Mean noise of the receiver without a signal, at the IF bandwidth it was read with. */
    noiseFloor?: { levelDbm: number; ifBandwidthHz: number };
  };
  positioner: { link: LinkAddress; family: ControllerFamily; axes: readonly RangeAxis[] };
  rangeAntenna: string;
  /** Largest dimension of the range antenna, and its gain as far as it is known. */
  rangeAntennaSizeM?: number;
  rangeAntennaGainDbi?: number;
  reference?: ReferenceAntenna;
  /** Absolute path of the archive. */
  archive: string;
}
