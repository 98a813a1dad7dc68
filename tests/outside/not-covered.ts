// Published values that nothing in daemon/pattern computes yet, with the reason. An entry with `part` is
// checked in all but that part.
export interface NotCovered {
  id: string;
  because: string;
  part?: string;
}

const directivity = 'directivity by quadrature is not built';
const design = 'a design figure of the antenna, no figure of a measured pattern';
const budget = 'the uncertainty budget is not built';
const gating = 'time gating is not built';
const polarization = 'polarization is not built';
const set = (ids: string[], because: string): NotCovered[] => ids.map((id) => ({ id, because }));

export const notCovered: readonly NotCovered[] = [
  ...set(
    ['A-DIP-SHORT-D', 'A-DIP-SHORT-DBI', 'A-DIP-HALF-DBI', 'A-MONO-QW', 'A-ISO', 'A-CIRC-D', 'A-RECT-D'],
    directivity,
  ),
  { id: 'A-CHEB10-D', because: directivity },
  ...set(['A-HORN-OPT', 'A-CHEB10', 'A-CHEB10-FORMULA'], design),
  { id: 'A-DIP-LENGTH', because: directivity, part: 'directivity, directivity_dbi' },
  { id: 'A-CARD', because: directivity, part: 'D dBi' },
  { id: 'A-COSQ', because: directivity, part: 'directivity, directivity_dbi' },
  { id: 'A-SINQ', because: directivity, part: 'directivity, directivity_dbi' },
  { id: 'A-TAPER', because: design, part: 'efficiency, efficiency_db' },
  { id: 'A-TAPER-COS-RATIO', because: design, part: 'taper loss' },
  { id: 'A-ARR-BROAD', because: directivity, part: 'directivity, directivity_dbi' },
  { id: 'A-ARR-END', because: directivity, part: 'directivity, dBi' },
  { id: 'A-CHEB10-HPBW', because: 'an estimate of the textbook, not of a pattern', part: 'uniform HPBW x f' },
  { id: 'A-TAYLOR', because: design, part: 'A, sigma, hpbw_formula_deg' },
  ...set(
    ['C-PHASE-GAIN', 'C-AMPTAPER', 'C-AMPTAPER-025'],
    'the effects of range length are not budgeted yet',
  ),
  ...set(['C-MISU', 'C-RIPPLE-INV', 'C-SNR'], budget),
  ...set(['C-AR-XPD', 'C-PLF', 'C-PLF-SPIN', 'C-ELLIPSE', 'C-LUDWIG3', 'C-LUDWIG3-HUY'], polarization),
  ...set(['I-DBD', 'I-ERP25'], 'gains and radiated powers are over an isotropic antenna only'),
  { id: 'E-FCC-PTS', because: 'nobody but the general public is assumed near a range', part: 'occupational' },
  {
    id: 'E-ICNIRP-PTS',
    because: 'nobody but the general public is assumed near a range, and limits are power densities',
    part: 'occupational_w_m2, general_v_m, occupational_v_m',
  },
  { id: 'G-KAISER-MET', because: gating, part: 'side lobes, noise bandwidth, gain, other windows' },
  { id: 'G-RES', because: 'a range is measured one way; times are not shown', part: 'two_way_m, time_ns' },
  { id: 'G-ALIAS', because: 'times are not shown', part: 'alias_free_ns' },
  { id: 'I-FOAM', because: 'a choice of material' },
  { id: 'I-STEP', because: 'a rule for plans; nothing in the pattern mathematics asks for it' },
];
