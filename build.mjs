/**
 * Builds what a user runs: dist/cli.js, dist/worker.js, dist/index.js, and the page where its sources are. Run by
 * `npm ci` through the `prepare` script.
 */
import {
  chmodSync,
  copyFileSync,
  existsSync,
  mkdirSync,
  readdirSync,
  rmSync,
  statSync,
} from 'node:fs';
import { build } from 'esbuild';

rmSync('dist', { recursive: true, force: true });
mkdirSync('dist', { recursive: true });

const banner =
  "import { createRequire as _require } from 'node:module'; const require = _require(import.meta.url);";
await build({
  entryPoints: { cli: 'src/cli/bin.ts', worker: 'workers/worker.ts', index: 'src/index.ts' },
  outdir: 'dist',
  bundle: true,
  splitting: true,
  format: 'esm',
  platform: 'node',
  target: 'node20',
  chunkNames: 'chunks/[name]-[hash]',
  // commander and cli-progress are CommonJS and ask for Node's own modules
  banner: { js: banner },
  legalComments: 'none',
  logLevel: 'warning',
});
chmodSync('dist/cli.js', 0o755);
copyFileSync('src/device/device.schema.json', 'dist/device.schema.json');

if (existsSync('src/desk/vite.config.ts')) {
  const vite = await import('vite');
  await vite.build({ configFile: 'src/desk/vite.config.ts', logLevel: 'warn' });
}

const sizes = readdirSync('dist')
  .filter((name) => name.endsWith('.js'))
  .map((name) => `${name} ${Math.round(statSync(`dist/${name}`).size / 1024)} kB`);
console.log(`built: ${sizes.join(', ')}`);
