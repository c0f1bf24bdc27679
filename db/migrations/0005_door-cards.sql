CREATE TABLE "door_cards" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"ring" text NOT NULL,
	"token_hash" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "door_cards_lab_id_rig_id_pk" PRIMARY KEY("lab_id","rig_id")
);
--> statement-breakpoint
ALTER TABLE "door_cards" ADD CONSTRAINT "door_cards_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE UNIQUE INDEX "door_cards_token" ON "door_cards" USING btree ("token_hash");