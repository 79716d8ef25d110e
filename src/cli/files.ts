/** Reads inputs and writes outputs whole or not at all. */
import { closeSync, existsSync, openSync, readFileSync, renameSync, statSync, unlinkSync, writeSync } from 'node:fs'; // biome-ignore format: one import
import { basename, dirname, join } from 'node:path';
import type { Source } from '../commands.ts';
import { InputError } from '../input-error.ts';

/** Larger files are refused before they are read. */
export const FILE_BYTES_MAX = 64 * 1024 * 1024;

/** A file if there is one of this name, else an expression; names that look like files must exist. */
export function sourceOf(argument: string): Source {
  if (existsSync(argument)) return { name: argument, text: readText(argument) };
  if (/\.(qasm|mtx|json|txt)$/i.test(argument) || /^[\w./\\-]*\/[\w./\\-]*$/.test(argument)) {
    throw new InputError({ code: 'missing-file', message: `missing file: ${argument}` });
  }
  return { name: 'expression', text: argument, isExpression: true };
}

export function readText(file: string): string {
  let size: number;
  try {
    const stat = statSync(file);
    if (stat.isDirectory()) {
      throw new InputError({
        code: 'not-a-file',
        message: `expected a file, got a folder: ${file}`,
      });
    }
    size = stat.size;
  } catch (error) {
    if (error instanceof InputError) throw error;
    throw new InputError({ code: 'missing-file', message: `missing file: ${file}` });
  }
  if (size > FILE_BYTES_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `file size must be at most ${FILE_BYTES_MAX} bytes, got ${size}`,
      file,
    });
  }
  try {
    return readFileSync(file, 'utf8');
  } catch (error) {
    // no permission, or it vanished: the system's code says which
    const code = (error as NodeJS.ErrnoException).code ?? 'unknown';
    throw new InputError({
      code: 'unreadable',
      message: `expected a readable file, got ${code}: ${file}`,
    });
  }
}

/** Fails before any work is done when the file could not be written in the end. */
export function checkWritable(file: string, isForced: boolean): void {
  if (existsSync(file) && !isForced) {
    throw new InputError({
      code: 'file-exists',
      message: `expected a new file name, got one that exists: ${file}`,
      hint: 'use --force to replace it',
    });
  }
  if (!existsSync(dirname(file) || '.')) {
    throw new InputError({ code: 'missing-folder', message: `missing folder: ${dirname(file)}` });
  }
}

/** Writes to a name of its own beside the file, then renames: a reader never sees half a file. */
export function writeWhole(file: string, text: string): void {
  const temporary = join(dirname(file), `.${basename(file)}.tmp-${process.pid}`);
  try {
    const handle = openSync(temporary, 'wx');
    try {
      writeSync(handle, text);
    } finally {
      closeSync(handle);
    }
    renameSync(temporary, file);
  } catch (error) {
    if (existsSync(temporary)) unlinkSync(temporary);
    const code = (error as NodeJS.ErrnoException).code ?? 'unknown';
    throw new InputError({
      code: 'unwritable',
      message: `expected a place to write, got ${code}: ${file}`,
    });
  }
}
