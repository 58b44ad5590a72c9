/**
 * Colours of the picture, our own. Before and after the event differ in lightness and in the shape of the mark as well as in hue, so
 * that the picture is read in grey and by colour-blind eyes; the hues are a blue and an orange, which stay apart in every common form.
 */
export interface PlotPalette {
  readonly background: string;
  readonly panel: string;
  readonly ink: string;
  readonly faint: string;
  readonly grid: string;
  readonly before: string;
  readonly after: string;
  readonly fit: string;
  readonly epoch: string;
}

export const LIGHT_PALETTE: PlotPalette = {
  background: '#ffffff',
  panel: '#f6f7f9',
  ink: '#1b2330',
  faint: '#5b6675',
  grid: '#d9dee6',
  before: '#2f5d9b',
  after: '#d1600a',
  fit: '#1b2330',
  epoch: '#e9c46a',
};

export const DARK_PALETTE: PlotPalette = {
  background: '#12161d',
  panel: '#1a2029',
  ink: '#eef1f5',
  faint: '#a3adba',
  grid: '#313a47',
  before: '#7fb0ee',
  after: '#ff9d4d',
  fit: '#eef1f5',
  epoch: '#8a6a17',
};
