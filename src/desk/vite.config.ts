/** Builds the page into dist/desk: paths are relative, so any web server and any folder will do. */

import { fileURLToPath } from 'node:url';
import { gzipSync } from 'node:zlib';
import { defineConfig, type Plugin } from 'vite';

/** What the page may load before its first paint, in gzip kilobytes (1000 bytes): script, style and document. */
export const FIRST_LOAD_KB_MAX = 150;

const here = (path: string): string => fileURLToPath(new URL(path, import.meta.url));

/** Prints what is loaded at first and what later, and fails when the first load grows beyond its limit. */
function printSizes(): Plugin {
  return {
    name: 'print-sizes',
    generateBundle(_options, bundle) {
      const first: string[] = [];
      const visit = (name: string): void => {
        const part = bundle[name];
        if (!part || first.includes(name)) return;
        first.push(name);
        if (part.type !== 'chunk') return;
        part.imports.forEach(visit);
        for (const style of part.viteMetadata?.importedCss ?? []) visit(style);
      };
      for (const [name, part] of Object.entries(bundle)) {
        if (part.type === 'chunk' && part.isEntry) visit(name);
        else if (name.endsWith('.html')) visit(name);
      }
      const size = (name: string): number => {
        const part = bundle[name]!;
        const source = part.type === 'chunk' ? part.code : part.source;
        return gzipSync(source).length / 1000;
      };
      const rows = Object.keys(bundle).map((name) => ({ name, kb: size(name) }));
      const total = first.reduce((sum, name) => sum + size(name), 0);
      for (const { name, kb } of rows.sort((a, b) => b.kb - a.kb)) {
        const when = first.includes(name) ? 'at first' : 'when needed';
        console.log(`desk: ${name.padEnd(44)} ${kb.toFixed(1).padStart(7)} kB gzip, ${when}`);
      }
      console.log(`desk: first load ${total.toFixed(1)} kB gzip (limit ${FIRST_LOAD_KB_MAX})`);
      if (total > FIRST_LOAD_KB_MAX) this.error(`the first load is ${total.toFixed(1)} kB gzip`);
    },
  };
}

// biome-ignore lint/style/noDefaultExport: vite asks for it
export default defineConfig({
  root: here('.'),
  base: './',
  publicDir: false,
  oxc: { jsx: { runtime: 'automatic', importSource: 'preact' } },
  worker: { format: 'es' },
  plugins: [printSizes()],
  build: {
    outDir: here('../../dist/desk'),
    emptyOutDir: true,
    target: 'es2022',
    // an inlined file would be a data: address, which the content policy refuses
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
    reportCompressedSize: false,
  },
});
