/** The form of something planned: what is typed outlives the tab, and what others change comes in meanwhile. */
import { untrack } from 'svelte';
import { changedFields, follow, headsOfFields, type FormOf, type Opened } from './opened';

/** What is kept of the form; see frame/draft.ts. */
interface Kept<T> {
	load(): Promise<{ readonly typed: T; readonly opened?: Opened<T> | undefined } | undefined>;
	keep(value: { typed: T; opened: { typed: T; heads: Record<string, string[]> } }): void;
	drop(): void;
}

export class PlanForm<T extends object> {
	readonly #form: FormOf<T>;
	readonly #draft: Kept<T>;
	typed = $state<T>();
	#opened = $state.raw<Opened<T>>();
	#both = $state.raw<readonly string[]>([]);
	/**
	 * Called while a component is made.
	 * @param now the thing as the log has it, at any time
	 */
	constructor(form: FormOf<T>, draft: Kept<T>, now: () => Opened<T>) {
		this.#form = form;
		this.#draft = draft;
		void this.#load(now);
		$effect(() => {
			this.#follow(now());
		});
		$effect(() => {
			this.#keep();
		});
	}

	/** Fields that were changed here. */
	get changed(): readonly string[] {
		return this.#opened && this.typed
			? changedFields(this.#form, this.#opened.typed, this.typed)
			: [];
	}
	/** Of these, the ones that somebody else changed too since the form was opened. */
	get both(): readonly string[] {
		return this.#both;
	}
	/** What a change of these fields stands on: what was seen when the form was opened. */
	get on(): string[] {
		return this.#opened ? headsOfFields(this.#opened, this.changed) : [];
	}
	/** What is typed now, to be read. */
	get snapshot(): T | undefined {
		const typed: unknown = $state.snapshot(this.typed);
		return typed as T | undefined;
	}

	/** Begins again with what the log says now. */
	reopen(now: Opened<T>): void {
		this.#opened = now;
		this.typed = now.typed;
		this.#both = [];
		this.#draft.drop();
	}

	async #load(now: () => Opened<T>): Promise<void> {
		const kept = await this.#draft.load();
		const opened = kept?.opened ?? now();
		this.#opened = opened;
		this.typed = kept?.opened ? kept.typed : opened.typed;
		this.#follow(now());
	}

	#follow(now: Opened<T>): void {
		untrack(() => {
			const typed = this.snapshot;
			if (!typed || !this.#opened) return;
			const followed = follow(this.#form, this.#opened, typed, now);
			this.#both = followed.both;
			if (followed.opened === this.#opened) return;
			this.#opened = followed.opened;
			this.typed = followed.typed;
		});
	}

	#keep(): void {
		const typed = this.snapshot;
		if (!typed || !this.#opened) return;
		if (this.changed.length === 0) {
			this.#draft.drop();
			return;
		}
		const heads = Object.entries(this.#opened.heads).map(([name, ids]) => [name, [...ids]]);
		const opened = { typed: this.#opened.typed, heads: Object.fromEntries(heads) as never };
		this.#draft.keep({ typed, opened });
	}
}
