import { createRequire } from 'node:module'
import { dirname, join } from 'node:path'
import pdfmake from 'pdfmake'
import type { Content, TDocumentDefinitions } from 'pdfmake/interfaces'
import { levelUnit } from '~/projects/project'
import type { DrawRequest, GatheredContent, GatheredCover } from './gathered'
import { statusMeaning } from './package'
import { localDay, localTime, printedSections } from './printed-sections'
import { alarm, bodySize, caution, facts, grey, ink, page, signatures, styles, wantsNewPage } from './typeset'

const fontFolder = join(dirname(createRequire(import.meta.url).resolve('source-sans/package.json')), 'TTF')

/** Registers the one typeface and shuts every other door: a package draws from what it is given, nothing else. */
function setUpPdfmake(): void {
  pdfmake.setFonts({
    'Source Sans 3': {
      normal: join(fontFolder, 'SourceSans3-Regular.ttf'),
      bold: join(fontFolder, 'SourceSans3-Semibold.ttf'),
      italics: join(fontFolder, 'SourceSans3-It.ttf'),
      bolditalics: join(fontFolder, 'SourceSans3-SemiboldIt.ttf'),
    },
  })
  pdfmake.setUrlAccessPolicy(() => false)
  pdfmake.setLocalAccessPolicy((path) => path.startsWith(fontFolder))
}

/**
 * Draws a calculation package as an A4 PDF. The same request gives the same bytes: dates come from the request, not
 * from the clock. Throws when a figure or the document cannot be drawn.
 */
export async function drawPackage(request: DrawRequest): Promise<Buffer> {
  setUpPdfmake()
  return pdfmake.createPdf(packageDocument(request)).getBuffer()
}

/** The document as pdfmake's definition: a plain function of the request. */
export function packageDocument(request: DrawRequest): TDocumentDefinitions {
  const { content, cover } = request
  const reference = `${content.project.calcReference} ${cover.revision}`
  const final = cover.status === 'issued'
  const when = new Date(cover.issuedAt ?? cover.madeAt)
  const small = { color: grey, fontSize: 8.5 }
  return {
    pageSize: 'A4',
    pageMargins: [page.left, page.top, page.right, page.bottom],
    defaultStyle: { font: 'Source Sans 3', fontSize: bodySize, lineHeight: 1.14, color: ink },
    language: 'en-GB',
    info: {
      title: `${content.project.title}: ${reference}`,
      author: cover.madeBy,
      subject: `Calculation package ${reference}, ${cover.status}`,
      creator: 'Lavant',
      producer: 'Lavant',
      creationDate: when,
      modDate: when,
    },
    watermark: final
      ? undefined
      : {
          text: cover.status === 'draft' ? 'DRAFT' : cover.status.toUpperCase(),
          color: alarm,
          opacity: 0.07,
          bold: true,
          angle: -52,
        },
    header: (number) =>
      number === 1
        ? null
        : {
            margin: [page.left, 26, page.right, 0],
            columns: [
              { text: shortened(content.project.title), ...small },
              {
                text: `${reference}   ${final ? '' : cover.status.toUpperCase()}`.trim(),
                alignment: 'right',
                width: 'auto',
                ...small,
                color: final ? grey : alarm,
              },
            ],
            columnGap: 16,
          },
    footer: (number, pages) => ({
      margin: [page.left, 20, page.right, 0],
      columns: [
        { text: shortened(`${content.project.number} · ${content.project.client}`), ...small },
        { text: `${reference} · page ${number} of ${pages}`, alignment: 'right', width: 'auto', ...small },
      ],
      columnGap: 16,
    }),
    pageBreakBefore: wantsNewPage,
    styles,
    content: [...coverPage(content, cover), contentsPage(), ...printedSections(request)],
  }
}

/** One line at the head or foot of a page. */
function shortened(text: string): string {
  return text.length > 80 ? `${text.slice(0, 79)}…` : text
}

function coverPage(content: GatheredContent, cover: GatheredCover): Content[] {
  const { project } = content
  const signed = (role: 'originator' | 'checker' | 'approver', label: string) => {
    const found = cover.signatures.find((s) => s.role === role)
    return { label, name: found?.name ?? null, signed: found ? localTime(content, found.at) : '–' }
  }
  const titleSize = project.title.length > 90 ? 18 : project.title.length > 45 ? 23 : 28
  return [
    {
      text: 'CALCULATION PACKAGE',
      fontSize: 9.5,
      characterSpacing: 1.4,
      color: grey,
      margin: [0, 22, 0, 22],
    },
    { text: project.title, fontSize: titleSize, bold: true, lineHeight: 1.05, margin: [0, 0, 0, 6] },
    { text: project.client, fontSize: 13, color: grey, margin: [0, 0, 0, 22] },
    facts([
      ['Project number', project.number],
      ['Calculation reference', project.calcReference],
      ['Revision', `${cover.revision}: ${cover.reason}`],
      ['Status', `${cover.status}: ${statusMeaning[cover.status]}`],
      ['Issued for', cover.purpose],
      [cover.issuedAt ? 'Issued on' : 'Made on', localDay(content, cover.issuedAt ?? cover.madeAt)],
      [
        'Supersedes',
        cover.revisions.find((r) => r.revision !== cover.revision && r.issuedAt)?.revision ?? 'nothing',
      ],
      ['Distribution', cover.distribution || 'as the project manager decides'],
    ]).content,
    { text: 'Sign-off', style: 'sub' },
    signatures([
      signed('originator', 'Originator'),
      signed('checker', 'Checker'),
      signed('approver', 'Approver'),
    ]),
    {
      text: 'Each signature covers the input hash below. Checker and approver are not the originator.',
      style: 'small',
      margin: [0, 0, 0, 14],
    },
    facts([
      ['Input hash (SHA-256)', cover.inputSha256],
      ['Run of record', `run ${content.run.number}, Lavant engine ${content.run.result.engine}`],
      ['Its model file (SHA-256)', content.run.inputSha256],
      ['Levels', levelUnit(project.units.length, project.verticalDatum)],
      ['Grid reference system', `EPSG:${project.crsEpsg}`],
      ['Times', project.timeZone],
    ]).content,
    caution(
      'This package answers the question in section 1, for the use stated there, under the assumptions and limitations that it lists. ' +
        'It does not replace the judgement of a qualified engineer. Local codes and licensed practice govern.',
    ).content,
  ]
}

function contentsPage(): Content {
  return {
    toc: {
      title: { text: 'Contents', style: 'section', pageBreak: 'before' },
      textStyle: { fontSize: 9, lineHeight: 1 },
      numberStyle: { color: grey, fontSize: 9, lineHeight: 1 },
    },
  }
}
