/** What is typed into a form and not yet a line, kept on the device so that it outlives the tab. */
import * as z from 'zod/mini';
import { dropDraft, loadDraft, saveDraft } from '$lib/device/read';
import type { DeviceStore } from '$lib/device/store';

export class Draft<T extends z.core.$ZodType> {
	readonly #store: DeviceStore;
	readonly #key: string;
	readonly #schema: T;
	/** What shall be kept next; `drop` for nothing. */
	#next: { readonly value: z.output<T> } | 'drop' | undefined;
	#writing = false;

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

	/** At once, since a reload may follow the last key press; the latest waits only while another is being written. */
	keep(value: z.output<T>): void {
		this.#next = { value };
		void this.#write();
	}

	/** It became a line, or was given up. */
	drop(): void {
		this.#next = 'drop';
		void this.#write();
	}

	async #write(): Promise<void> {
		if (this.#writing) return;
		this.#writing = true;
		while (this.#next !== undefined) {
			const next = this.#next;
			this.#next = undefined;
			try {
				if (next === 'drop') await dropDraft(this.#store, this.#key);
				else await saveDraft(this.#store, this.#key, next.value);
			} catch {
				// Without room the text stays in the form, and saving the line says so.
			}
		}
		this.#writing = false;
	}
}
