// The status model of the instrument: standard event register, its mask, and the status byte over it.

export const eventBits = { operationComplete: 1, queryError: 4, deviceError: 8, powerOn: 128 } as const;

export class StatusRegisters {
  #events = 0;
  eventEnable = 0;
  serviceEnable = 0;
  operationEnable = 0;
  /** Event register of the operation branch; read clears. */
  #operationEvents = 0;

  setEvent(bit: number): void {
    this.#events |= bit;
  }

  setOperationEvent(bit: number): void {
    this.#operationEvents |= bit;
  }

  /** Reads and clears. */
  takeEvents(): number {
    const events = this.#events;
    this.#events = 0;
    return events;
  }

  takeOperationEvents(): number {
    const events = this.#operationEvents;
    this.#operationEvents = 0;
    return events;
  }

  /** Clears what has happened; masks stay. */
  clear(): void {
    this.#events = 0;
    this.#operationEvents = 0;
  }

  /** As after power has come: nothing but the power-on event. */
  powerOn(): void {
    this.clear();
    this.eventEnable = 0;
    this.serviceEnable = 0;
    this.operationEnable = 0;
    this.setEvent(eventBits.powerOn);
  }

  /** Bit 2 errors, 5 events, 6 summary, 7 operation. No bit 4: a socket needs no "answer waiting". */
  statusByte(errorsWaiting: boolean): number {
    let byte = errorsWaiting ? 4 : 0;
    if (this.#events & this.eventEnable) byte |= 32;
    if (this.#operationEvents & this.operationEnable) byte |= 128;
    if (byte & this.serviceEnable & ~64) byte |= 64;
    return byte;
  }
}
