import { Router } from 'express';
import { problemCodes, type ProblemCode } from '@/shared/contracts/problem';
import { problemTitles } from './problem-error';

const isCode = (text: string): text is ProblemCode => text in problemTitles;

/** The pages that the `type` of a problem points to. */
export function problemPages(): Router {
  const router = Router();
  router.get('/:code', (req, res, next) => {
    const { code } = req.params;
    if (!isCode(code)) {
      next();
      return;
    }
    const title = problemTitles[code];
    res
      .type('html')
      .send(
        `<!doctype html><html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width"><title>${title}</title></head>` +
          `<body><h1>${title}</h1><p>Problem code <code>${code}</code>, HTTP status ${String(problemCodes[code])}. The answer's <code>detail</code> says what is wrong, where, and what would be right.</p></body></html>`,
      );
  });
  return router;
}
