// Numbers as the texts of the checks show them: few digits, a unit that keeps them readable, a true minus sign.

const trueMinus = (text: string): string => text.replace('-', '−');

/** Three significant digits without an exponent; what is larger keeps its whole part. */
function digits(value: number): string {
  const rounded = Number(value.toPrecision(3));
  return trueMinus(Math.abs(value) >= 1000 ? String(Math.round(value)) : String(rounded));
}

export function lengthText(lengthM: number): string {
  if (lengthM >= 1) return `${digits(lengthM)} m`;
  return lengthM >= 0.01 ? `${digits(lengthM * 100)} cm` : `${digits(lengthM * 1000)} mm`;
}

/** Rounded up, so that what is advised is enough. */
export function enoughMetresText(lengthM: number): string {
  return `${trueMinus((Math.ceil(lengthM * 100 - 1e-6) / 100).toFixed(2))} m`;
}

export function megahertzText(frequencyHz: number): string {
  return `${Number((frequencyHz / 1e6).toFixed(3))} MHz`;
}

export function hertzText(frequencyHz: number): string {
  if (frequencyHz >= 1e6) return megahertzText(frequencyHz);
  return frequencyHz >= 1000 ? `${digits(frequencyHz / 1000)} kHz` : `${digits(frequencyHz)} Hz`;
}

export function decibelText(levelDb: number): string {
  const text = levelDb.toFixed(1);
  return `${Number(text) === 0 ? '0.0' : trueMinus(text)} dB`;
}

export function degreesText(angleDeg: number): string {
  return `${trueMinus(String(Number(angleDeg.toFixed(2)) + 0))}°`;
}

export function wattsText(powerW: number): string {
  if (powerW >= 1) return `${digits(powerW)} W`;
  return powerW >= 1e-3 ? `${digits(powerW * 1e3)} mW` : `${digits(powerW * 1e6)} µW`;
}

export function bytesText(bytes: number): string {
  if (bytes >= 1e9) return `${digits(bytes / 1e9)} GB`;
  return bytes >= 1e6 ? `${digits(bytes / 1e6)} MB` : `${digits(Math.max(1, bytes / 1e3))} kB`;
}

export function durationText(ms: number): string {
  if (ms < 120_000) return `${Math.ceil(ms / 1000)} s`;
  return ms < 7_200_000 ? `${Math.round(ms / 60_000)} min` : `${(ms / 3_600_000).toFixed(1)} h`;
}

/** The age of what is hours or days old. */
export function daysText(ms: number): string {
  const hours = ms / 3_600_000;
  if (hours < 48) return `${Math.max(0, Math.round(hours))} h`;
  return `${Math.round(hours / 24)} days`;
}
