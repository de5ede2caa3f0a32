import type { Page } from '@playwright/test';

/**
 * What can be touched on the page as it is and measures less than `least` CSS pixels either way. A box or radio button
 * and a choice of a file are as large as their label, which is touched for them. Links in running text are left out: they
 * have the height of their line, and WCAG 2.5.8 excepts what is in a sentence.
 */
export function tooSmall(page: Page, least: number, within = 'body'): Promise<string[]> {
	return page.evaluate(
		([enough, part]) => {
			const TOUCHABLE =
				'a[href], button, input:not([type=hidden]), select, textarea, summary, [contenteditable=true], ' +
				['button', 'checkbox', 'link', 'menuitem', 'option', 'radio', 'slider', 'switch', 'tab']
					.map((role) => `[role=${role}]`)
					.join();

			function isShown(element: Element): boolean {
				if (!element.checkVisibility({ visibilityProperty: true, opacityProperty: true }))
					return false;
				// Only for who hears it.
				return getComputedStyle(element).clipPath !== 'inset(50%)';
			}

			/** Boxes that are touched as one, as one. */
			function sizeOf(element: Element): { width: number; height: number } | undefined {
				const touched =
					element instanceof HTMLInputElement &&
					['checkbox', 'radio', 'file'].includes(element.type)
						? [element, ...(element.labels ?? [])]
						: [element];
				const boxes = touched.filter(isShown).map((one) => one.getBoundingClientRect());
				if (boxes.length === 0) return undefined;
				const span = (from: (box: DOMRect) => number, to: (box: DOMRect) => number) =>
					Math.max(...boxes.map(to)) - Math.min(...boxes.map(from));
				return {
					width: span(
						({ left }) => left,
						({ right }) => right
					),
					height: span(
						({ top }) => top,
						({ bottom }) => bottom
					)
				};
			}

			/** Set inline, with other words beside it in its paragraph. */
			function isInSentence(element: Element): boolean {
				if (getComputedStyle(element).display !== 'inline') return false;
				let block = element.parentElement;
				while (block && ['inline', 'contents'].includes(getComputedStyle(block).display))
					block = block.parentElement;
				if (!block) return false;
				const words = document.createTreeWalker(block, NodeFilter.SHOW_TEXT);
				while (words.nextNode()) {
					const beside = words.currentNode.parentElement;
					if (!beside || beside.closest(TOUCHABLE) || !isShown(beside)) continue;
					if (/\p{L}/u.test(words.currentNode.textContent ?? '')) return true;
				}
				return false;
			}

			// Behind a sheet nothing can be touched.
			const root = document.querySelector('dialog:modal') ?? document.querySelector(part);
			const found: string[] = [];
			for (const element of root?.querySelectorAll(TOUCHABLE) ?? []) {
				if (isInSentence(element)) continue;
				const size = sizeOf(element);
				// The hundredth is for sums of fractions.
				if (size && Math.min(size.width, size.height) < enough - 0.01) {
					const name =
						element.getAttribute('aria-label') ??
						((element instanceof HTMLElement && element.innerText.trim()) ||
							element.getAttribute('name'));
					found.push(
						`${element.tagName.toLowerCase()} “${name ?? ''}” ${size.width.toFixed(1)} x ${size.height.toFixed(1)}`
					);
				}
			}
			return found;
		},
		[least, within] as const
	);
}
