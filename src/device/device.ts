/**
 * A device as its maker's calibration data describe it. Every field is optional but the links; what is
 * missing is left out of every estimate and named there. Errors of gates are average infidelities
 * (1 - average gate fidelity), the figure that randomised benchmarking gives.
 */
export type DeviceWire = {
  /** Relaxation time, microseconds. */
  t1Us?: number;
  /** Dephasing time, microseconds; at most 2 T1. */
  t2Us?: number;
  /** Probability that a measurement records the wrong bit. */
  readoutError?: number;
  /** Average infidelity of a one-wire gate. */
  gateError?: number;
  gateDurationNs?: number;
};

export type DeviceLink = {
  between: readonly [number, number];
  /** Average infidelity of the entangler. */
  error?: number;
  durationNs?: number;
};

export type Device = {
  name: string;
  wires: readonly DeviceWire[];
  links: readonly DeviceLink[];
  measureDurationNs?: number;
  resetDurationNs?: number;
  /** Probability that a reset leaves the wire in |1>. */
  resetError?: number;
};

/** The link between two wires of the device, in either direction. */
export function linkBetween(device: Device, a: number, b: number): DeviceLink | undefined {
  return device.links.find(({ between: [p, q] }) => (p === a && q === b) || (p === b && q === a));
}
