/** What is typed into a form and not yet a line, kept on the device so that it outlives the tab. */
import * as z from 'zod/mini';
import { dropDraft, loadDraft, saveDraft } from '$lib/device/read';
import type { DeviceStore } from '$lib/device/store';

const DELAY = 300;

export class Draft<T extends z.core.$ZodType> {
	readonly #store: DeviceStore;
	readonly #key: string;
	readonly #schema: T;
	#timer: ReturnType<typeof setTimeout> | undefined;
	#waiting: z.output<T> | undefined;

	/** @param key names the form; @param schema of what is kept: a draft of an older form is dropped */
	constructor(store: DeviceStore, key: string, schema: T) {
		this.#store = store;
		this.#key = key;
		this.#schema = schema;
	}

	async load(): Promise<z.output<T> | undefined> {
		try {
			const kept = z.safeParse(this.#schema, await loadDraft(this.#store, this.#key));
			return kept.success ? kept.data : undefined;
		} catch {
			// A form opens without its draft rather than not at all.
			return undefined;
		}
	}

	/** Keeps the value a moment after the last change. */
	keep(value: z.output<T>): void {
		this.#waiting = value;
		clearTimeout(this.#timer);
		this.#timer = setTimeout(() => {
			this.flush();
		}, DELAY);
	}

	/** Keeps at once what waits to be kept: the form goes away. */
	flush(): void {
		clearTimeout(this.#timer);
		const value = this.#waiting;
		this.#waiting = undefined;
		// Without room the text stays in the form, and saving the line says so.
		if (value !== undefined) saveDraft(this.#store, this.#key, value).catch(() => undefined);
	}

	/** It became a line, or was given up. */
	drop(): void {
		clearTimeout(this.#timer);
		this.#waiting = undefined;
		dropDraft(this.#store, this.#key).catch(() => undefined);
	}
}
