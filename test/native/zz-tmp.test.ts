import { test } from 'vitest';
import { shannonGates, shannonCount } from '/work/main/src/native/shannon.ts';
import { haarUnitary } from '/work/main/src/numeric/svd.ts';
import { random } from '/work/main/src/numeric/random.ts';
import { circuitUnitary } from '/work/main/src/circuit/unitary.ts';
import { emptyCircuit } from '/work/main/src/circuit/circuit.ts';
import { hilbertSchmidtDistance } from '/work/main/src/numeric/distance.ts';
import { toNative } from '/work/main/src/native/to-native.ts';
import { nativeSetOf } from '/work/main/src/native/native-set.ts';
test('x', () => {
  for (let n = 2; n <= 8; n++) {
    const u = haarUnitary(2 ** n, random(n, 's'));
    const t0 = performance.now();
    const g = shannonGates(u, n);
    const t1 = performance.now();
    const nat = toNative(g, n, nativeSetOf('cx,rz,sx'));
    const t2 = performance.now();
    const m = circuitUnitary({ ...emptyCircuit(n), operations: nat });
    const { phase } = hilbertSchmidtDistance(u, m);
    let gap = 0; const h = u.length / 2;
    for (let k = 0; k < h; k++) { const c = Math.cos(phase), s = Math.sin(phase); 
      gap = Math.max(gap, Math.min(Math.hypot(m[k] - c*u[k] + s*u[h+k], m[h+k] - c*u[h+k] - s*u[k]), Math.hypot(m[k] - c*u[k] - s*u[h+k], m[h+k] - c*u[h+k] + s*u[k])));}
    console.log(n, nat.filter(o => o.wires.length === 2).length, shannonCount(n), hilbertSchmidtDistance(u, m).distance, gap, (t1 - t0) | 0, (t2 - t1) | 0);
  }
}, 300000);
