import { open, rename } from 'node:fs/promises';
import { join } from 'node:path';

/**
 * Writes a file so that a reader never sees half of it, and a crash neither: the bytes are on disk under the final name, or the final
 * name is as before. Write, flush, rename, flush the folder.
 */
export async function writeWhole(
  folder: string,
  name: string,
  content: string | Uint8Array,
  mode: number,
): Promise<void> {
  const temporary = join(folder, `.${name}.tmp`);
  const file = await open(temporary, 'w', mode);
  try {
    await file.writeFile(content);
    await file.sync();
  } finally {
    await file.close();
  }
  await rename(temporary, join(folder, name));
  const directory = await open(folder, 'r');
  try {
    await directory.sync();
  } finally {
    await directory.close();
  }
}
