#!/usr/bin/env node
/** The program itself: words in, exit code out. */
import { main } from './main.ts';

// a reader that goes away (`| head`) is no fault
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  process.exit(error.code === 'EPIPE' ? 0 : 70);
});
process.exitCode = await main(process.argv.slice(2));
