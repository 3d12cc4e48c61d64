// Colours have one meaning each and two themes: they come from the tokens of src/styles/global.css and nowhere else.

const HEX = /#(?:[0-9a-f]{8}|[0-9a-f]{6}|[0-9a-f]{3,4})(?![\w-])/gi;
const FUNCTION = /\b(?:rgba?|hsla?|hwb|lab|lch|oklab|oklch|color)\(\s*[\d.]/gi;
const PALETTE =
  /(?<![\w-])(?:bg|text|border|ring|fill|stroke|from|via|to|outline|decoration|accent|divide|shadow)-(?:(?:red|orange|amber|yellow|lime|green|emerald|teal|cyan|sky|blue|indigo|violet|purple|fuchsia|pink|rose|slate|gray|zinc|neutral|stone)-\d{2,3}|white|black)(?![\w-])/g;

/** @type {import('eslint').Rule.RuleModule} */
export const noRawColours = {
  meta: {
    type: 'problem',
    schema: [],
    messages: { raw: '"{{found}}" is a raw colour. Use a token of src/styles/global.css: a class such as text-madder, or var(--madder) in a style.' },
  },
  create(context) {
    return {
      Program() {
        const { text } = context.sourceCode;
        for (const pattern of [HEX, FUNCTION, PALETTE]) {
          for (const match of text.matchAll(pattern)) {
            const before = text.slice(Math.max(0, match.index - 12), match.index);
            // In-page links, HTML entities and private members look like hexadecimal numbers.
            if (pattern === HEX && (/(?:href=["'{`]*|\/|&|\w|\.)$/.test(before) || !/["'`\s:([,]$/.test(before))) continue;
            const start = context.sourceCode.getLocFromIndex(match.index);
            const end = context.sourceCode.getLocFromIndex(match.index + match[0].length);
            context.report({ loc: { start, end }, messageId: 'raw', data: { found: match[0] } });
          }
        }
      },
    };
  },
};
