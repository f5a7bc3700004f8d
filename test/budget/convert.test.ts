import { describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { Fraction } from '../../src/base/fraction.ts'
import { deltaOf, epsilonOf, rhoCap } from '../../src/budget/convert.ts'

/** Tight conversion of Canonne, Kamath & Steinke 2020; independent 60-digit arithmetic, 30 digits kept: epsilon, delta, largest rho. */
const caps = [
  ['0.1', '1e-5', '0.000432993729401809519397789398516'],
  ['0.1', '1e-6', '0.000321047690345740097036259399233'],
  ['0.1', '5e-7', '0.000297413626106145852628662949082'],
  ['0.1', '1e-8', '0.000208816380942711852313639637808'],
  ['0.1', '1e-10', '0.000153605037347088136011045966858'],
  ['0.25', '1e-5', '0.00235636146709311186681808190682'],
  ['0.25', '1e-6', '0.00180154835038125681377231139692'],
  ['0.25', '5e-7', '0.0016803960745028584357630039978'],
  ['0.25', '1e-8', '0.00121211004403922788441137808353'],
  ['0.25', '1e-10', '0.000907824042405444427028219797107'],
  ['0.5', '1e-5', '0.00850553059118191127178279157741'],
  ['0.5', '1e-6', '0.0066415243566605020279084511737'],
  ['0.5', '5e-7', '0.00622481712165892443884740938757'],
  ['0.5', '1e-8', '0.00457818104025115317716943275243'],
  ['0.5', '1e-10', '0.00347500341460086932847176982489'],
  ['1', '1e-5', '0.0305565951976395656126465679373'],
  ['1', '1e-6', '0.0243559703595383728942432458986'],
  ['1', '5e-7', '0.0229374466887221828391695518089'],
  ['1', '1e-8', '0.017205318039373676306240264047'],
  ['1', '1e-10', '0.0132425837657040132543725513074'],
  ['2', '1e-5', '0.108256363823057258712027245057'],
  ['2', '1e-6', '0.0881526883799462663886996931232'],
  ['2', '5e-7', '0.0834417178336797692083478066128'],
  ['2', '1e-8', '0.0639404456730883224906303080243'],
  ['2', '1e-10', '0.0499868499726444000962843784469'],
  ['4', '1e-5', '0.373143982769328673783337081127'],
  ['4', '1e-6', '0.311064954940835067742928570617'],
  ['4', '5e-7', '0.296131423331097794302439987966'],
  ['4', '1e-8', '0.232594311142432859392496924676'],
  ['4', '1e-10', '0.185275307672530945163056463911'],
  ['8', '1e-5', '1.22971452576143122223376122536'],
  ['8', '1e-6', '1.0523580045569888959723672085'],
  ['8', '5e-7', '1.00845291477548402264936840434'],
  ['8', '1e-8', '0.815663255450658172615621801286'],
  ['8', '1e-10', '0.665103846917594520049270461879'],
] as const

/** The same source: rho, epsilon, least delta. */
const deltas = [
  ['0.001', '0.5', '1.35239096151296037441692878581e-30'],
  ['0.001', '1', '3.23385355201589992357325462708e-112'],
  ['0.001', '2', '5.07342239732109734298563896025e-438'],
  ['0.01', '0.5', '0.0000350587806005239097401528487187'],
  ['0.01', '1', '1.66411397738799453696767355143e-13'],
  ['0.01', '2', '3.70158317843388993549757295317e-46'],
  ['0.02', '0.5', '0.00154103331493326778797111066086'],
  ['0.02', '1', '0.0000000882525498722115052557757918745'],
  ['0.02', '2', '3.81936719104719030793013151381e-24'],
  ['0.05', '0.5', '0.0230316977367376159746318443336'],
  ['0.05', '1', '0.000385709163744412207433951130238'],
  ['0.05', '2', '1.00553331311481923655571931539e-10'],
  ['0.1', '0.5', '0.077062292463260695900900798171'],
  ['0.1', '1', '0.00893324577181836182999865936667'],
  ['0.1', '2', '0.00000432521086909255823195922823402'],
  ['0.5', '0.5', '0.399889849021707805091502609646'],
  ['0.5', '1', '0.246846330782944487074846780067'],
  ['0.5', '2', '0.0542929966402624839597587070584'],
] as const

/** The same source: rho, delta, least epsilon. */
const epsilons = [
  ['0.0001', '1e-5', '0.0450474620877772279865332644702'],
  ['0.0001', '1e-6', '0.0537271206348598680249524247195'],
  ['0.0001', '1e-8', '0.0681270260236153746431574700676'],
  ['0.0001', '1e-10', '0.0801436984417259633938300352669'],
  ['0.001', '1e-5', '0.157335393161215504254924136966'],
  ['0.001', '1e-6', '0.182895377190076231230406574087'],
  ['0.001', '1e-8', '0.226155714359017595926524011098'],
  ['0.001', '1e-10', '0.262790475140458507720930961363'],
  ['0.005', '1e-5', '0.375261235699023151240411129187'],
  ['0.005', '1e-6', '0.429941468836949273470532979246'],
  ['0.005', '1e-8', '0.523556126952163942109416347763'],
  ['0.005', '1e-10', '0.603536128979830889369402423839'],
  ['0.01', '1e-5', '0.545725548274002399286074843711'],
  ['0.01', '1e-6', '0.621692654559602495022295093088'],
  ['0.01', '1e-8', '0.752325885458361886445996364016'],
  ['0.01', '1e-10', '0.864321185724172915746266635738'],
  ['0.02', '1e-5', '0.794314774274068379931673866853'],
  ['0.02', '1e-6', '0.89993526766064186678270706831'],
  ['0.02', '1e-8', '1.08230844397031810040709754804'],
  ['0.02', '1e-10', '1.23917580775162923232154646715'],
  ['0.05', '1e-5', '1.30811834290643812139357925568'],
  ['0.05', '1e-6', '1.47159475053241598093695029173'],
  ['0.05', '1e-8', '1.75527810225381585215515720177'],
  ['0.05', '1e-10', '2.00027604752227695663370923898'],
  ['0.1', '1e-5', '1.91423883200359779853142046492'],
  ['0.1', '1e-6', '2.14193892838547366139748650757'],
  ['0.1', '1e-8', '2.53843221178699167761040113052'],
  ['0.1', '1e-10', '2.88182800917424247499165842412'],
  ['0.5', '1e-5', '4.72838698494331389997054898848'],
  ['0.5', '1e-6', '5.22153444453016904422096144444'],
  ['0.5', '1e-8', '6.08615861466979846449511117981'],
  ['0.5', '1e-10', '6.83932941312084849630267907751'],
  ['1', '1e-5', '7.07719669580633975862190709342'],
  ['1', '1e-6', '7.76621662531172073643548400473'],
  ['1', '1e-8', '8.97721843355715064615919644198'],
  ['1', '1e-10', '10.0343435813476298880469248301'],
  ['2', '1e-5', '10.7248241129391721425138254991'],
  ['2', '1e-6', '11.688596249354894036867192872'],
  ['2', '1e-8', '13.3861046488578974150574799072'],
  ['2', '1e-10', '14.8706780068137472332679444465'],
] as const

const parse = Fraction.parse
/** One unit of the thirtieth digit, and what the search may lose. */
const sharp = parse('1e-22')

/** Holds that `value` is on the safe side of the reference and within 1e-22 of it, relatively; the reference's own last digit may be rounded. */
function expectAbove(value: Fraction, reference: string): void {
  const truth = parse(reference)
  expect(truth.mul(Fraction.one.sub(parse('1e-28'))).isAtMost(value)).toBe(true)
  expect(value.isAtMost(truth.mul(Fraction.one.add(sharp)))).toBe(true)
}

function expectBelow(value: Fraction, reference: string): void {
  const truth = parse(reference)
  expect(value.isAtMost(truth.mul(Fraction.one.add(parse('1e-28'))))).toBe(true)
  expect(truth.mul(Fraction.one.sub(sharp)).isAtMost(value)).toBe(true)
}

describe('the conversion between rho and (epsilon, delta)', () => {
  test('gives the largest rho of a cap to more than twelve digits, rounded down', () => {
    for (const [epsilon, delta, rho] of caps) expectBelow(rhoCap(parse(epsilon), parse(delta)), rho)
    expect(rhoCap(parse('1'), parse('1e-6')).toDecimal(13, 'down')).toBe('0.0243559703595')
  })

  test('gives the least delta to more than twelve digits, rounded up', () => {
    for (const [rho, epsilon, delta] of deltas) {
      // Past the exponent that a text may have, the last digits are shifted by hand.
      const [digits, exponent] = delta.split('e-')
      const lift = exponent !== undefined && Number(exponent) > 300 ? 300 : 0
      const value = deltaOf(parse(rho), parse(epsilon)).mul(parse(`1e${lift}`))
      expectAbove(value, exponent === undefined ? delta : `${digits}e-${Number(exponent) - lift}`)
    }
  })

  test('gives the least epsilon to more than twelve digits, rounded up', () => {
    for (const [rho, delta, epsilon] of epsilons) expectAbove(epsilonOf(parse(rho), parse(delta)), epsilon)
  })

  test('agrees with the published parameters of the 2020 US Census redistricting data: 17.14 is rho 2.56 and 2.47 is rho 0.07 at delta 1e-10', () => {
    expect(rhoCap(parse('17.14'), parse('1e-10')).toDecimal(19, 'nearest')).toBe('2.5553177660014467751')
    expect(rhoCap(parse('17.14'), parse('1e-10')).toDecimal(2, 'nearest')).toBe('2.56')
    expect(rhoCap(parse('2.47'), parse('1e-10')).toDecimal(2, 'nearest')).toBe('0.07')
    expect(rhoCap(parse('2.47'), parse('1e-10')).toDecimal(12, 'down')).toBe('0.074675510756')
  })

  test('never promises more than it keeps: the rho of a cap converts back to at most its delta, and the next larger one does not', () => {
    for (const [epsilon, delta] of [
      ['1', '1e-6'],
      ['1e-6', '1e-30'],
      ['1e-6', '0.1'],
      ['3', '1e-30'],
      ['1000', '1e-8'],
      ['1e6', '1e-6'],
    ] as const) {
      const rho = rhoCap(parse(epsilon), parse(delta))
      const slack = Fraction.one.add(parse('1e-15'))
      expect(deltaOf(rho, parse(epsilon)).isAtMost(parse(delta).mul(slack))).toBe(true)
      expect(parse(delta).isLess(deltaOf(rho.mul(Fraction.one.add(parse('1e-12'))), parse(epsilon)))).toBe(true)
      expect(epsilonOf(rho, parse(delta)).isAtMost(parse(epsilon).mul(slack))).toBe(true)
    }
  })

  test('reaches an epsilon of 1e30, where rho is all but epsilon', () => {
    const rho = rhoCap(parse('1e30'), parse('1e-6'))
    expect(rho.isLess(parse('1e30'))).toBe(true)
    expect(rho.div(parse('1e30')).toDecimal(12, 'down')).toBe('0.999999999999')
    expect(deltaOf(rho, parse('1e30')).toDecimal(12, 'up')).toBe('0.000001000000')
  })

  test('says nothing where nothing is to be said', () => {
    expect(rhoCap(parse('1'), Fraction.zero)).toEqual(Fraction.zero)
    expect(deltaOf(Fraction.zero, parse('1'))).toEqual(Fraction.zero)
    expect(deltaOf(parse('2000'), parse('1'))).toEqual(Fraction.one)
    expect(epsilonOf(Fraction.zero, parse('0.1'))).toEqual(Fraction.zero)
    expect(epsilonOf(parse('1e-15'), parse('1e-6'))).toEqual(Fraction.zero)
    expect(() => rhoCap(Fraction.zero, parse('1e-6'))).toThrow(BrokenCheck)
    expect(() => rhoCap(parse('1'), parse('0.5'))).toThrow(BrokenCheck)
  })
})
