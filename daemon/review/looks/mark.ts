/** The tab's mark: a level line that steps once. */
export const MARK = `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 32 32"><rect width="32" height="32" rx="7" fill="#1c2a33"/><path d="M5 22h11V10h11" fill="none" stroke="#e9b872" stroke-width="3.4" stroke-linecap="round" stroke-linejoin="round"/></svg>`;
