/** `127.0.0.1:8417` or `[::1]:8417`; the complaint says what else was found. */
export function parseListen(
  text: string,
): { readonly host: string; readonly port: number } | { readonly problem: string } {
  const match = /^(?:\[([0-9A-Fa-f:.]+)\]|([A-Za-z0-9_.-]+)):([0-9]{1,5})$/.exec(text);
  const port = Number(match?.[3]);
  if (match === null || port > 65_535)
    return { problem: `must be an address and a port such as "127.0.0.1:8417", found "${text}"` };
  return { host: match[1] ?? match[2]!, port };
}
