/** Runs before anything is drawn, so that a page chosen dark never flashes white. Without a choice the system's own light holds. */
export const THEME_SCRIPT = `'use strict';
(() => {
  try {
    const chosen = localStorage.getItem('spinvigil.light');
    if (chosen === 'day' || chosen === 'night') document.documentElement.dataset.light = chosen;
  } catch {
    // No storage: the system's light holds.
  }
})();
`;
