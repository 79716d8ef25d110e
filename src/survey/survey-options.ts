import type { ContractOptions } from '../contract.ts';
import type { Control } from '../control.ts';

export type SurveyOptions = ContractOptions & {
  seed?: number;
  /** Probe influence with states on up to this many wires; 16 unless given, 0 never. */
  probeWiresMax?: number;
  control?: Control;
};
