import { readFile } from 'node:fs/promises';
import { createRequire } from 'node:module';
import { initWasm, Resvg } from '@resvg/resvg-wasm';

/** SVG to PNG, for mail: mail programs do not show SVG. The fonts come with the program, so that a bare host draws the same picture. */

const FONT_FILES = ['dejavu-fonts-ttf/ttf/DejaVuSans.ttf', 'dejavu-fonts-ttf/ttf/DejaVuSans-Bold.ttf'];

let prepared: Promise<Uint8Array[]> | null = null;

/** Gets ready what takes a second or two the first time, so that the first alert need not wait for it. */
export async function prepareRenderer(): Promise<void> {
  await renderPng(FIRST_PICTURE);
}

const FIRST_PICTURE = '<svg xmlns="http://www.w3.org/2000/svg" width="8" height="8"><text y="8">ν</text></svg>';

/** @returns the PNG, as wide as the SVG says */
export async function renderPng(svg: string): Promise<Buffer> {
  prepared ??= prepare().catch((error: unknown) => {
    prepared = null;
    throw error;
  });
  const fontBuffers = await prepared;
  const drawing = new Resvg(svg, { font: { fontBuffers, defaultFontFamily: 'DejaVu Sans', loadSystemFonts: false } });
  try {
    const image = drawing.render();
    try {
      return Buffer.from(image.asPng());
    } finally {
      image.free();
    }
  } finally {
    drawing.free();
  }
}

async function prepare(): Promise<Uint8Array[]> {
  const { resolve } = createRequire(import.meta.url);
  const fonts = await Promise.all(FONT_FILES.map((file) => readFile(resolve(file))));
  await initWasm(await readFile(resolve('@resvg/resvg-wasm/index_bg.wasm')));
  return fonts;
}
