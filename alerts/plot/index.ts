export { eventSvg, type PlotWords } from './eventSvg.ts';
export { DARK_PALETTE, LIGHT_PALETTE, type PlotPalette } from './palette.ts';
