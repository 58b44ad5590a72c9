/**
 * The same message with a line of text where its picture was: for a server that finds it too large. Message-ID and everything else
 * stay. Works on the bytes that `compose` made, so that what was queued once is what leaves.
 * @returns null when there is no picture in it
 */
export function withoutPicture(mime: Buffer): Buffer | null {
  // One character a byte: nothing is decoded, so nothing can change.
  const text = mime.toString('latin1');
  const type = text.indexOf('\r\nContent-Type: image/png');
  if (type < 0) return null;
  const start = text.lastIndexOf('\r\n--', type);
  const boundary = /^\r\n--[^\r\n]*/.exec(text.slice(start))?.[0];
  if (boundary === undefined) return null;
  const end = text.indexOf(boundary, type);
  if (end < 0) return null;
  return Buffer.from(text.slice(0, start) + boundary + LEFT_OUT + text.slice(end), 'latin1');
}

const LEFT_OUT = [
  '',
  'Content-Type: text/plain; charset=us-ascii; name=picture-left-out.txt',
  'Content-Disposition: attachment; filename=picture-left-out.txt',
  '',
  'The picture was left out: the mail server takes no message of that size.',
  'The review page shows it.',
].join('\r\n');
