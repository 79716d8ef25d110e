/** Compiles kernels.ts and sweep.ts to WebAssembly and embeds it as base64 in ../module.generated.ts. Run by `npm run kernels`. */
import { writeFileSync } from 'node:fs';
import asc from 'assemblyscript/asc';

let bytes;
const { error, stderr } = await asc.main(
  // the module needs no runtime and no data of its own
  ['src/numeric/kernels/assembly/kernels.ts', 'src/numeric/kernels/assembly/sweep.ts', '-O3', '--noAssert', '--runtime', 'stub', '--enable', 'simd', '--use', 'abort=', '--outFile', 'kernels.wasm'],
  { writeFile: (name, contents) => { if (name.endsWith('.wasm')) bytes = contents; } },
);
if (error || !bytes) throw new Error(stderr.toString());
writeFileSync(
  'src/numeric/kernels/module.generated.ts',
  `/** Made by \`npm run kernels\` from assembly/kernels.ts. */\nexport const KERNEL_MODULE =\n  '${Buffer.from(bytes).toString('base64')}';\n`,
);
