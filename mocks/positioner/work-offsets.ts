// The six work coordinate systems, the temporary shift and the two stored places of the simulated controller.
// The systems and places are non-volatile; the temporary shift dies with a reset.

export class WorkOffsets {
  readonly #axisCount: number;
  /** G54 … G59, machine coordinates of each system's zero. */
  readonly systems: number[][];
  /** G28 and G30. */
  readonly places: number[][];
  shift: number[];
  selected = 0;

  constructor(axisCount: number) {
    this.#axisCount = axisCount;
    this.systems = Array.from({ length: 6 }, () => this.#zeros());
    this.places = [this.#zeros(), this.#zeros()];
    this.shift = this.#zeros();
  }

  /** Machine coordinates of the present work zero. */
  get total(): number[] {
    return this.shift.map((value, axis) => value + this.systems[this.selected]![axis]!);
  }

  /** A way back to the present values, for a line that is refused after it was half read. */
  restorePoint(): () => void {
    const { selected } = this;
    const shift = [...this.shift];
    const systems = this.systems.map((values) => [...values]);
    return () => {
      this.selected = selected;
      this.shift = shift;
      this.systems.splice(0, systems.length, ...systems);
    };
  }

  reset(): void {
    this.shift = this.#zeros();
    this.selected = 0;
  }

  /** The lines of `$#`. */
  lines(): string[] {
    const list = (values: readonly number[]): string => values.map((value) => value.toFixed(3)).join(',');
    return [
      ...this.systems.map((values, index) => `[G${54 + index}:${list(values)}]`),
      `[G28:${list(this.places[0]!)}]`,
      `[G30:${list(this.places[1]!)}]`,
      `[G92:${list(this.shift)}]`,
      '[TLO:0.000]',
      `[PRB:${list(this.#zeros())}:0]`,
    ];
  }

  #zeros(): number[] {
    return new Array<number>(this.#axisCount).fill(0);
  }
}
