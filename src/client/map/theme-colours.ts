import { createColourScale, readHex } from './colour-scale.ts';

const TOKENS = ['linen', 'linen-raised', 'linen-sunk', 'line', 'line-strong', 'ink', 'ink-soft', 'woad', 'madder', 'weld', 'walnut', 'lichen', 'woad-wash', 'madder-wash', 'weld-wash', 'walnut-wash'] as const;
export type Token = (typeof TOKENS)[number];

export interface ThemeColours {
  /** `#rrggbb` per token. */
  token: Record<Token, string>;
  /** Bytes of the scale for fields; see `createColourScale`. */
  scale: Uint8Array;
}

/** The colour tokens in force. */
export const readThemeColours = (): ThemeColours => {
  const style = getComputedStyle(document.documentElement);
  const token = Object.fromEntries(TOKENS.map((name) => [name, style.getPropertyValue(`--${name}`).trim()])) as Record<Token, string>;
  return { token, scale: createColourScale([readHex(token['weld-wash']), readHex(token.woad), readHex(token.ink)]) };
};

/** Calls back when the theme changes. */
export const watchTheme = (onChange: () => void): { destroy(): void } => {
  const observer = new MutationObserver(onChange);
  observer.observe(document.documentElement, { attributes: true, attributeFilter: ['data-theme', 'class'] });
  const media = matchMedia('(prefers-color-scheme: dark)');
  media.addEventListener('change', onChange);
  return {
    destroy() {
      observer.disconnect();
      media.removeEventListener('change', onChange);
    },
  };
};
