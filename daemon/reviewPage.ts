import { EXIT, OperatorError, reasonOf } from './errors.ts';
import type { ReviewDesk } from './review/desk.ts';
import { type ReviewServer, startReviewServer } from './review/server.ts';
import type { Station } from './station.ts';

/** The review page while the daemon runs. A port that is taken keeps neither feeds nor mail waiting: the page comes when it is free. */
export interface ReviewPage {
  /** Null while it cannot listen. */
  url(): string | null;
  close(): Promise<void>;
}

const RETRY_MS = 30_000;

/** Rejects when the address can never be right; resolves, listening or not, otherwise. */
export async function openReviewPage(station: Station, desk: ReviewDesk): Promise<ReviewPage> {
  const { log, configuration, clock } = station;
  const settings = {
    ...configuration.review,
    desk,
    observatory: configuration.observatory.name,
    now: () => clock.now(),
    onFault: ({ id, error }: { id: string; error: unknown }) =>
      log.error({ id, err: error }, 'fault on the review page'),
  };
  let server: ReviewServer | null = null;
  let closed = false;
  let retry: NodeJS.Timeout | undefined;

  const open = async () => {
    try {
      server = await startReviewServer(settings);
      if (closed) await server.close();
      else log.info({ url: server.url }, 'review page listens');
    } catch (error) {
      if (error instanceof OperatorError && error.exitCode === EXIT.wrongUsage) throw error;
      log.error({ reason: reasonOf(error) }, 'no review page yet; trying again every 30 seconds');
      if (!closed) retry = setTimeout(() => void open(), RETRY_MS);
    }
  };
  await open();
  return {
    url: () => server?.url ?? null,
    close: async () => {
      closed = true;
      clearTimeout(retry);
      await server?.close();
    },
  };
}
