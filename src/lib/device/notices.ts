/** "Something changed": told to every screen of this page and to every other tab of the same person. */
import * as z from 'zod/mini';

/** Old tabs read what new ones send: fields are only ever added. */
const Notice = z.object({
	/** Undefined when no build is meant, as for the keys. */
	build: z.optional(z.string()),
	/** Seams whose lines changed; '' for the lines that concern none. Empty: only counts or states did. */
	parts: z.array(z.string()),
	/** Somebody here wrote lines: there is something to offer. */
	appended: z.optional(z.boolean()),
	/** The device of this store is another from now on. */
	device: z.optional(z.string())
});
export type Notice = z.output<typeof Notice>;

export class Notices {
	readonly #listeners = new Set<(notice: Notice) => void>();
	readonly #channel: BroadcastChannel | undefined;

	constructor(name: string) {
		if (typeof BroadcastChannel !== 'function') return;
		this.#channel = new BroadcastChannel(name);
		this.#channel.onmessage = ({ data }: MessageEvent<unknown>) => {
			const notice = Notice.safeParse(data);
			if (notice.success) this.#tell(notice.data);
		};
		// In Node an open channel would keep the process alive.
		(this.#channel as { unref?: () => void }).unref?.();
	}

	subscribe(listener: (notice: Notice) => void): () => void {
		this.#listeners.add(listener);
		return () => {
			this.#listeners.delete(listener);
		};
	}

	send(notice: Notice): void {
		this.#tell(notice);
		this.#channel?.postMessage(notice);
	}

	close(): void {
		this.#listeners.clear();
		this.#channel?.close();
	}

	#tell(notice: Notice): void {
		for (const listener of [...this.#listeners]) {
			// A screen that fails must not make a saved line look unsaved.
			try {
				listener(notice);
			} catch (error) {
				reportError(error);
			}
		}
	}
}

function reportError(error: unknown): void {
	queueMicrotask(() => {
		throw error;
	});
}
