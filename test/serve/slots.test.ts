import { expect, test } from 'vitest'
import { createSlots } from '../../src/serve/slots.ts'

const never = new AbortController().signal

async function settled(promise: Promise<unknown>): Promise<boolean> {
  return await Promise.race([promise.then(() => true), new Promise<boolean>((resolve) => setTimeout(() => resolve(false), 5))])
}

test('an owner holds no more than its share of the places, so that another finds one at once', async () => {
  const slots = createSlots(4, 3)
  const held = await Promise.all([1, 2, 3].map(() => slots.take('ana', never)))
  const fourth = slots.take('ana', never)
  expect(await settled(fourth)).toBe(false)
  expect(await settled(slots.take('ben', never))).toBe(true)
  held[0]?.()
  expect(await settled(fourth)).toBe(true)
})

test('of those who wait, the one with fewer places goes first, then the one who came first', async () => {
  const slots = createSlots(2, 2)
  const [first, second] = await Promise.all([slots.take('ana', never), slots.take('ana', never)])
  const order: string[] = []
  const waiting = ['ana', 'ana', 'ben', 'cleo'].map(async (owner) => {
    const back = await slots.take(owner, never)
    order.push(owner)
    back()
  })
  first?.()
  second?.()
  await Promise.all(waiting)
  expect(order[0]).toBe('ben')
  expect(order.toSorted()).toEqual(['ana', 'ana', 'ben', 'cleo'])
})

test('who gives up waiting leaves the queue, and a place given back twice is one place', async () => {
  const slots = createSlots(1, 1)
  const back = await slots.take('ana', never)
  const gone = new AbortController()
  const left = slots.take('ben', gone.signal)
  gone.abort(new Error('gone'))
  await expect(left).rejects.toThrow('gone')
  back()
  back()
  await slots.take('cleo', never)
  expect(await settled(slots.take('dan', never))).toBe(false)
})
