import { parentPort } from 'node:worker_threads';
import { parseBuffer } from 'music-metadata';
import { analyseRecording } from '@/lib/acoustics/analyse';
import { encodePeaks } from '@/lib/acoustics/pictures/peaks';
import { encodeSpectrogram } from '@/lib/acoustics/pictures/spectrogram';
import type { AnalysisRequest, AnalysisResult, FromWorker, ToWorker } from './messages';

/** How much of a file its tags are looked for in. */
const METADATA_HEAD_BYTES = 256 * 1024;

/** Chunks that arrive by message, as the async sequence that the analysis reads. */
class Inbox {
  readonly #chunks: Uint8Array[] = [];
  #over = false;
  #wake: (() => void) | null = null;
  push(bytes: Uint8Array): void {
    this.#chunks.push(bytes);
    this.#wake?.();
  }
  end(): void {
    this.#over = true;
    this.#wake?.();
  }
  async *read(taken: () => void): AsyncGenerator<Uint8Array> {
    for (;;) {
      const next = this.#chunks.shift();
      if (next) {
        yield next;
        taken();
      } else if (this.#over) return;
      else
        await new Promise<void>((resolve) => {
          this.#wake = resolve;
        });
    }
  }
}

async function readMetadata(head: Uint8Array, mediaType: string): Promise<Record<string, unknown> | null> {
  try {
    const { common, format } = await parseBuffer(
      head,
      { mimeType: mediaType },
      { duration: false, skipCovers: true },
    );
    const { tagTypes, container, codec, codecProfile, tool, creationTime } = format;
    const tags = {
      title: common.title,
      artist: common.artist,
      comment: common.comment,
      date: common.date,
      encodedby: common.encodedby,
      encodersettings: common.encodersettings,
    };
    return JSON.parse(
      JSON.stringify({ tagTypes, container, codec, codecProfile, tool, creationTime, tags }),
    ) as Record<string, unknown>;
  } catch {
    // Tags are a courtesy; the judge reads the file itself.
    return null;
  }
}

async function analyse(request: AnalysisRequest, chunks: AsyncIterable<Uint8Array>): Promise<AnalysisResult> {
  const head: Uint8Array[] = [];
  let headBytes = 0;
  async function* watched(): AsyncGenerator<Uint8Array> {
    for await (const chunk of chunks) {
      if (headBytes < METADATA_HEAD_BYTES) {
        head.push(chunk.subarray(0, METADATA_HEAD_BYTES - headBytes));
        headBytes += chunk.byteLength;
      }
      yield chunk;
    }
  }
  const analysis = await analyseRecording(watched(), {
    declaredMediaType: request.mediaType,
    limits: request.limits,
    totalBytes: request.totalBytes,
  });
  return {
    verdict: analysis.verdict,
    findings: analysis.findings,
    measures: analysis.measures,
    facts: analysis.facts as unknown as Record<string, unknown>,
    metadata: await readMetadata(Buffer.concat(head), request.mediaType),
    peaks: analysis.peaks ? encodePeaks(analysis.peaks) : null,
    spectrogram: analysis.spectrogram ? encodeSpectrogram(analysis.spectrogram) : null,
  };
}

let inbox = new Inbox();
const say = (message: FromWorker) => parentPort?.postMessage(message);

parentPort?.on('message', (message: ToWorker) => {
  if (message.type === 'chunk') return inbox.push(message.bytes);
  if (message.type === 'end') return inbox.end();
  inbox = new Inbox();
  analyse(
    message.request,
    inbox.read(() => say({ type: 'taken' })),
  ).then(
    (result) => say({ type: 'result', result }),
    (error: unknown) =>
      say({ type: 'failed', message: error instanceof Error ? error.message : String(error) }),
  );
});

say({ type: 'ready' });
